/**
 * Runs a pool that can be interrupted, tells what is delivered and when it is interrupted, and ends without
 * being made to. Arguments: number of jobs, milliseconds a job, grace in milliseconds, and how the jobs
 * behind the first one behave.
 */
import { writeSync } from 'node:fs';
import { withInterrupt } from '../../../src/files/withInterrupt.js';
import { runChunks } from '../../../src/files/workerPool.js';
import type { Answer, Order } from './obedientWorker.js';

const [count, milliseconds, grace, behave] = process.argv.slice(2);
const tell = (line: string): void => void writeSync(1, `${line}\n`);

function orderOf(index: number): Order | undefined {
  if (index >= Number(count)) return undefined;
  const order = { number: index + 1, milliseconds: Number(milliseconds) };
  if (behave === undefined || index === 0) return order;
  return { ...order, behave: behave as NonNullable<Order['behave']> };
}

try {
  const { value, interrupted } = await withInterrupt((signal) => {
    signal.addEventListener('abort', () => tell('interrupted'));
    return runChunks<Order, Answer>({
      workers: 2,
      entry: new URL('./obedientWorker.js', import.meta.url),
      setup: { greeting: 'hello' },
      jobs: orderOf,
      onResult: ({ number }) => tell(String(number)),
      signal,
      graceMilliseconds: Number(grace),
    });
  });
  tell(JSON.stringify({ ...value, interrupted }));
  if (interrupted) process.exitCode = 130;
} catch (error) {
  tell((error as Error).message);
}

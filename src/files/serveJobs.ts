import { parentPort, workerData } from 'node:worker_threads';
import type { JobMessage, ReplyMessage } from './workerMessages.js';
import { faultOf } from './workerMessages.js';

/**
 * The worker's side of `runChunks`: the entry module calls this once. `prepare` gets the pool's `setup` and
 * returns the function that answers jobs; it runs once per worker, before the first job. What it or the
 * function throws ends the pool's run with an error that names the job. `buffersOf` lists the buffers of a
 * result that are handed over instead of copied: they must not be those of a WebAssembly memory, and the
 * worker cannot use them afterwards.
 * @throws Error outside a worker
 */
export function serveJobs<Setup, Job, Result>(
  prepare: (setup: Setup) => ((job: Job) => Result | Promise<Result>) | Promise<(job: Job) => Result>,
  buffersOf: (result: Result) => readonly ArrayBufferLike[] = () => [],
): void {
  if (parentPort === null) throw new Error('jobs are served in a worker only');
  const port = parentPort;
  const prepared = (async () => prepare(workerData as Setup))();
  // The first job tells; until then a fault of preparing is not an unhandled one.
  prepared.catch(() => undefined);

  const answer = async ({ index, job }: JobMessage): Promise<void> => {
    try {
      const result = await (await prepared)(job as Job);
      const buffers = buffersOf(result).filter((buffer) => buffer instanceof ArrayBuffer);
      port.postMessage({ index, result } satisfies ReplyMessage, buffers);
    } catch (error) {
      port.postMessage({ index, fault: faultOf(error) } satisfies ReplyMessage);
    }
  };
  let last: Promise<void> = Promise.resolve();
  port.on('message', (message: JobMessage) => {
    last = last.then(() => answer(message));
  });
}

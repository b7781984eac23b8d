import { spawn } from 'node:child_process';
import { cpus, loadavg } from 'node:os';
import { createInterface } from 'node:readline';
import { fileURLToPath } from 'node:url';

/** The middle value; of an even number of values the upper one of the two. NaN without values. */
export function medianOf(values: readonly number[]): number {
  return values.toSorted((a, b) => a - b)[values.length >> 1] ?? NaN;
}

/** What a figure was measured on: processor, cores, Node, and how busy the machine is with other work. */
export function machineLine(): string {
  const processors = cpus();
  const load = loadavg()[0]!.toFixed(1);
  return (
    `${processors[0]?.model ?? 'unknown processor'}, ${processors.length} cores, Node ${process.version}; ` +
    `load of the machine over the last minute ${load}`
  );
}

/**
 * Processor time in microseconds that this process has used. Unlike the time of day it stands still while
 * another program has the core.
 */
export function processorMicroseconds(): number {
  const { user, system } = process.cpuUsage();
  return user + system;
}

/** A program beside this one that answers each line with one number. */
export interface Yardstick {
  /** The first line that it printed: what it is. */
  readonly version: string;
  ask(question: string): Promise<number>;
  close(): void;
}

/**
 * Starts a script of this folder, with Debian's Python before any other; null when none has NumPy and SciPy.
 */
export async function startYardstick(script: string): Promise<Yardstick | null> {
  return (await startWith('/usr/bin/python3', script)) ?? (await startWith('python3', script));
}

async function startWith(interpreter: string, script: string): Promise<Yardstick | null> {
  const path = fileURLToPath(new URL(script, import.meta.url));
  const python = spawn(interpreter, [path], { stdio: ['pipe', 'pipe', 'ignore'] });
  python.on('error', () => undefined);
  python.stdin.on('error', () => undefined);
  const lines = createInterface({ input: python.stdout })[Symbol.asyncIterator]();
  const first = await lines.next();
  if (first.done === true) return null;
  return {
    version: first.value,
    ask: async (question) => {
      python.stdin.write(`${question}\n`);
      const answer = await lines.next();
      return answer.done === true ? NaN : Number(answer.value);
    },
    close: () => void python.stdin.end(),
  };
}

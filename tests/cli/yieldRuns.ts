import { spawn } from 'node:child_process';
import { existsSync, readdirSync } from 'node:fs';
import { readFile } from 'node:fs/promises';
import { join } from 'node:path';
import { setTimeout as sleep } from 'node:timers/promises';
import { COMMAND } from './runCommand.js';

/** A table of doubles, row by row. */
export interface Table {
  readonly shape: readonly number[];
  readonly values: Float64Array;
}

/**
 * Reads an .npy file of little-endian doubles in C order by the description of the format (NumPy Enhancement
 * Proposal 1).
 */
export async function readTable(path: string): Promise<Table> {
  const bytes = await readFile(path);
  if (bytes.toString('latin1', 1, 6) !== 'NUMPY' || bytes[0] !== 0x93 || bytes[6] !== 1) {
    throw new Error('this is no .npy file of format 1');
  }
  const start = 10 + bytes.readUInt16LE(8);
  const header = bytes.toString('latin1', 10, start);
  const shape = /^\{'descr': '<f8', 'fortran_order': False, 'shape': \((\d+), (\d+)\), \} *\n$/.exec(header);
  if (shape === null || start % 64 !== 0) throw new Error(`unexpected header ${header}`);
  const values = Float64Array.from({ length: (bytes.length - start) / 8 }, (_, k) =>
    bytes.readDoubleLE(start + 8 * k),
  );
  return { shape: shape.slice(1).map(Number), values };
}

/** Every result in a folder, byte for byte, the report without times and rates. */
export async function resultsIn(folder: string): Promise<Record<string, string>> {
  const results: Record<string, string> = {};
  for (const name of readdirSync(folder).sort()) {
    const bytes = await readFile(join(folder, name));
    results[name] = name === 'report.json' ? withoutTimes(bytes.toString()) : bytes.toString('base64');
  }
  return results;
}

/** A report without `seconds` and `trialsPerSecond`. */
export function withoutTimes(report: string): string {
  return report.replaceAll(/^ {2}"(?:seconds|trialsPerSecond)": [-\d.e]+,\n/gm, '');
}

/** How many finished chunks a run under way has on disk. */
export function chunksIn(folder: string): number {
  const partial = join(folder, '.partial');
  if (!existsSync(partial)) return 0;
  return readdirSync(partial).filter((name) => /^chunk-\d+\.bin$/.test(name)).length;
}

/** How a command ended that was sent a signal. */
export interface StoppedRun {
  readonly code: number | null;
  readonly stderr: string;
}

/**
 * Starts the built command and sends it a signal as soon as `when` holds; gives up on `when` at the command's
 * end.
 */
export async function stopCommand(
  args: readonly string[],
  folder: string,
  signal: 'SIGINT' | 'SIGKILL',
  when: () => boolean,
): Promise<StoppedRun> {
  const child = spawn(process.execPath, [COMMAND, ...args], {
    cwd: folder,
    stdio: ['ignore', 'ignore', 'pipe'],
  });
  const stderr: Buffer[] = [];
  child.stderr.on('data', (chunk: Buffer) => stderr.push(chunk));
  let ended = false;
  const end = new Promise<StoppedRun>((resolve, reject) => {
    child.on('error', reject);
    child.on('close', (code) => {
      ended = true;
      resolve({ code, stderr: Buffer.concat(stderr).toString() });
    });
  });
  while (!ended && !when()) await sleep(3);
  child.kill(signal);
  return end;
}

import type { ChildProcess } from 'node:child_process';
import { spawn } from 'node:child_process';
import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { afterAll } from 'vitest';
import { workerIn } from './builtCopy.js';

const madeFolders: string[] = [];
afterAll(() => {
  for (const folder of madeFolders) rmSync(folder, { recursive: true, force: true });
});

/** A fresh empty folder, removed when the tests of the file are done. */
export function freshFolder(): string {
  const folder = mkdtempSync(join(tmpdir(), 'phasewright-files-'));
  madeFolders.push(folder);
  return folder;
}

/** A script under way. */
export interface Script {
  readonly child: ChildProcess;
  /** Fulfilled when this line has been printed. */
  readonly printed: (line: string) => Promise<void>;
  readonly end: Promise<{
    readonly code: number | null;
    readonly signal: NodeJS.Signals | null;
    readonly lines: readonly string[];
    readonly stderr: string;
  }>;
}

/** Starts a program of the folder `workers` in a process of its own, from a built copy. */
export function startScript(copy: string, name: string, args: readonly (string | number)[]): Script {
  const path = fileURLToPath(workerIn(copy, name));
  const child = spawn(process.execPath, [path, ...args.map(String)], {
    stdio: ['ignore', 'pipe', 'pipe'],
  });
  let stdout = '';
  let stderr = '';
  let changed = (): void => undefined;
  child.stdout.on('data', (bytes: Buffer) => {
    stdout += bytes.toString();
    changed();
  });
  child.stderr.on('data', (bytes: Buffer) => (stderr += bytes.toString()));
  const lines = (): string[] => stdout.split('\n').slice(0, -1);
  return {
    child,
    printed: (line) =>
      new Promise((fulfil, reject) => {
        changed = () => {
          if (lines().includes(line)) fulfil();
        };
        child.once('close', () => reject(new Error(`ended without printing ${line}: ${stdout}${stderr}`)));
        changed();
      }),
    end: new Promise((fulfil) => {
      child.once('close', (code, signal) => fulfil({ code, signal, lines: lines(), stderr }));
    }),
  };
}

import { spawn } from 'node:child_process';
import { mkdtempSync, readdirSync, rmSync } from 'node:fs';
import { mkdir, readFile, writeFile } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { dirname, join } from 'node:path';
import { fileURLToPath, pathToFileURL } from 'node:url';
import ts from 'typescript';
import { afterAll } from 'vitest';

/** The built command; `npm run build` comes before these tests. */
export const COMMAND = fileURLToPath(new URL('../../dist/cli/main.js', import.meta.url));

export interface RunOptions {
  /** Files that stand in the folder before the run, by path within it. */
  readonly files?: Readonly<Record<string, string | Uint8Array>>;
  /** Standard input; without it, it is empty. */
  readonly input?: string | Uint8Array;
  /** Run in this folder instead of in a fresh one. */
  readonly folder?: string;
  readonly environment?: Readonly<Record<string, string>>;
  /** Arguments for node itself. */
  readonly nodeArguments?: readonly string[];
}

export interface CommandRun {
  readonly code: number | null;
  readonly stdout: string;
  readonly stderr: string;
  /** The folder in which the command ran. */
  readonly folder: string;
  /** Every file and (ending in a slash) folder in it afterwards, sorted. */
  readonly listing: readonly string[];
  /** The text of a file in it. */
  readonly read: (path: string) => Promise<string>;
}

const madeFolders: string[] = [];
afterAll(() => {
  for (const folder of madeFolders) rmSync(folder, { recursive: true, force: true });
});

/** A fresh empty folder, removed when the tests of the file are done. */
export function freshFolder(): string {
  const folder = mkdtempSync(join(tmpdir(), 'phasewright-test-'));
  madeFolders.push(folder);
  return folder;
}

/** Runs the built command and waits for its end. */
export async function runCommand(args: readonly string[], options: RunOptions = {}): Promise<CommandRun> {
  const folder = options.folder ?? freshFolder();
  await writeFiles(folder, options.files);
  const { code, stdout, stderr } = await runProgram(
    process.execPath,
    [...(options.nodeArguments ?? []), COMMAND, ...args],
    folder,
    options,
  );
  return { code, stdout, stderr, ...inFolder(folder) };
}

/**
 * Runs the built program once for each call, all in one process, each in a fresh folder of its own: for
 * tables of faults, where starting it anew would take most of the time. Exit codes are those that the program
 * returns; standard input is not served.
 */
export async function runMany(
  calls: readonly { readonly args: readonly string[]; readonly files: RunOptions['files'] }[],
): Promise<CommandRun[]> {
  const folders = await Promise.all(
    calls.map(async ({ files }) => {
      const folder = freshFolder();
      await writeFiles(folder, files);
      return folder;
    }),
  );
  const input = JSON.stringify(calls.map(({ args }, k) => ({ args, folder: folders[k] })));
  const commandLine = pathToFileURL(join(dirname(COMMAND), 'commandLine.js')).href;
  // As JavaScript: worker threads inherit the arguments of node, and find no loader of TypeScript from a
  // folder of their own.
  const source = await readFile(fileURLToPath(new URL('manyRuns.ts', import.meta.url)), 'utf8');
  const { outputText: script } = ts.transpileModule(source, {
    compilerOptions: { module: ts.ModuleKind.ESNext, target: ts.ScriptTarget.ES2022 },
  });
  const scriptFolder = freshFolder();
  await writeFiles(scriptFolder, { 'manyRuns.mjs': script });
  const { stdout, stderr } = await runProgram(process.execPath, ['manyRuns.mjs', commandLine], scriptFolder, {
    input,
  });
  if (stdout === '') throw new Error(`the runs came to no end: ${stderr}`);
  const results = JSON.parse(stdout) as Pick<CommandRun, 'code' | 'stdout' | 'stderr'>[];
  return results.map((result, k) => ({ ...result, ...inFolder(folders[k]!) }));
}

function inFolder(folder: string): Pick<CommandRun, 'folder' | 'listing' | 'read'> {
  return { folder, listing: listFolder(folder), read: (path) => readFile(join(folder, path), 'utf8') };
}

async function writeFiles(folder: string, files: RunOptions['files'] = {}): Promise<void> {
  for (const [path, content] of Object.entries(files)) {
    await mkdir(dirname(join(folder, path)), { recursive: true });
    await writeFile(join(folder, path), content);
  }
}

/** Runs any program in a folder; signals count as the code null. */
export function runProgram(
  program: string,
  args: readonly string[],
  folder: string,
  { input = '', environment = {} }: Pick<RunOptions, 'input' | 'environment'> = {},
): Promise<{ code: number | null; stdout: string; stderr: string }> {
  return new Promise((resolve, reject) => {
    const child = spawn(program, args, {
      cwd: folder,
      env: { ...plainEnvironment(), ...environment },
      stdio: ['pipe', 'pipe', 'pipe'],
    });
    const [stdout, stderr]: [Buffer[], Buffer[]] = [[], []];
    child.stdout.on('data', (chunk: Buffer) => stdout.push(chunk));
    child.stderr.on('data', (chunk: Buffer) => stderr.push(chunk));
    child.on('error', reject);
    child.on('close', (code) =>
      resolve({ code, stdout: Buffer.concat(stdout).toString(), stderr: Buffer.concat(stderr).toString() }),
    );
    // A command that fails early does not read its input: the broken pipe is then no fault of the test.
    child.stdin.on('error', () => undefined);
    child.stdin.end(input);
  });
}

/** The environment without what test runners add for colours. */
function plainEnvironment(): NodeJS.ProcessEnv {
  const environment = { ...process.env };
  for (const name of ['FORCE_COLOR', 'NO_COLOR', 'NODE_OPTIONS']) delete environment[name];
  return environment;
}

function listFolder(folder: string, within = ''): string[] {
  return readdirSync(join(folder, within), { withFileTypes: true })
    .flatMap((entry) => {
      const path = `${within}${entry.name}`;
      return entry.isDirectory() ? [`${path}/`, ...listFolder(folder, `${path}/`)] : [path];
    })
    .sort();
}

/** JSON as a record, for reports. */
export function asRecord(text: string): Record<string, unknown> {
  return JSON.parse(text) as Record<string, unknown>;
}

/** The figures of merit in a report. */
export function meritOf(report: string, key = 'merit'): Record<string, number> {
  return asRecord(report)[key] as Record<string, number>;
}

/**
 * An .npy file, format 1.0, of complex numbers given as pairs in C order (numpy.lib.format, NumPy Enhancement
 * Proposal 1).
 */
export function npyFile(shape: readonly number[], pairs: readonly (readonly [number, number])[]): Uint8Array {
  const sizes = shape.length === 1 ? `${shape[0]},` : shape.join(', ');
  return npyBytes(
    `{'descr': '<c16', 'fortran_order': False, 'shape': (${sizes}), }`,
    new Uint8Array(new Float64Array(pairs.flat()).buffer),
  );
}

/** An .npy file with this header and these bytes of data. */
export function npyBytes(header: string, data: Uint8Array): Uint8Array {
  const length = Math.ceil((10 + header.length + 1) / 64) * 64 - 10;
  const start = Buffer.from([0x93, 0x4e, 0x55, 0x4d, 0x50, 0x59, 1, 0, length & 255, length >> 8]);
  return Buffer.concat([start, Buffer.from(`${header.padEnd(length - 1)}\n`, 'latin1'), data]);
}

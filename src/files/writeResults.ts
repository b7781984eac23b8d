import { existsSync, rmSync } from 'node:fs';
import { readFile, rename, rm } from 'node:fs/promises';
import { basename, dirname, join, resolve } from 'node:path';
import { InputError } from '../errors/InputError.js';
import { INTERRUPTED } from './withInterrupt.js';
import { makeFolder, requireFree, temporaryName, unwritable, writeTemporary } from './writeFile.js';

/** Name of the file that holds the whole result of a command; it is written last. */
export const REPORT_FILE = 'report.json';

/** A folder of results about to be written. */
export interface Results {
  readonly folder: string;
  /** Contents by file name, without the report. */
  readonly files: ReadonlyMap<string, string | Uint8Array>;
  /** The report's text; it holds `runId` and `files`. */
  readonly report: string;
  readonly runId: string;
  /** The command that ran, as its report names it. */
  readonly command: string;
  /** Replace results of another run, and a file of the user's name. */
  readonly force: boolean;
  /**
   * A report that stands alone may be replaced by one of the same command: nothing is lost that was asked for
   * by name.
   */
  readonly replacesLoneReport?: boolean;
  /** A file that the user named, written with the results or not at all. */
  readonly named?: NamedFile;
}

/** A file that the user named with an option of his own. */
export interface NamedFile {
  readonly path: string;
  readonly content: string | Uint8Array;
}

/**
 * Writes the results of a run: each file whole or not at all, the report last. Results of the same run (same
 * `runId`) are replaced, and so are, with `force`, those of another one; what else an earlier run of the same
 * command left is removed. Files of another command stay, since they may be what this one has read. When
 * anything fails, or the process is told to end, no new folder and no half file is left behind.
 * @throws InputError `output/exists` when other results are in the way, `file/unwritable`
 */
export async function writeResults(results: Results): Promise<void> {
  const { folder, force } = results;
  const contents: [path: string, content: string | Uint8Array][] = [...results.files].map(
    ([name, content]) => [join(folder, name), content],
  );
  const { named } = results;
  if (named !== undefined) {
    refuseReportName(named, folder);
    await requireFree(named.path, named.content, force);
    // It may be one of the results under its own name: once is enough.
    if (!contents.some(([path]) => resolve(path) === resolve(named.path))) {
      contents.unshift([named.path, named.content]);
    }
  }
  contents.push([join(folder, REPORT_FILE), results.report]);
  await requireNoOtherRun(results);
  const madeFolders: (string | undefined)[] = [];
  const temporaries: string[] = [];
  const release = cleanUpOnSignal(() => {
    for (const [path] of contents) rmSync(temporaryName(path), { force: true });
    for (const made of madeFolders) if (made !== undefined) rmSync(made, { recursive: true, force: true });
  });
  try {
    for (const path of [folder, ...(named ? [dirname(named.path)] : [])]) {
      madeFolders.push(await makeFolder(path));
    }
    for (const [path, content] of contents) temporaries.push(await writeTemporary(path, content));
    // Once more, now that only renaming is left: another run may have written there meanwhile.
    const earlier = await requireNoOtherRun(results);
    if (earlier !== undefined && earlier.runId !== results.runId && earlier.command === results.command) {
      // The old report goes first and the new one comes last: at no moment does a report stand beside another
      // run's files.
      for (const name of [REPORT_FILE, ...earlier.files]) await rm(join(folder, name), { force: true });
    }
    for (const [k, [path]] of contents.entries()) await rename(temporaries[k]!, path);
  } catch (error) {
    for (const temporary of temporaries) await rm(temporary, { force: true });
    for (const made of madeFolders) if (made !== undefined) await rm(made, { recursive: true, force: true });
    throw error instanceof InputError ? error : unwritable(folder, error);
  } finally {
    release();
  }
}

/** Ctrl-C while files are being written: cleans up and ends. Returns what takes the handlers away again. */
function cleanUpOnSignal(cleanUp: () => void): () => void {
  const end = (): void => {
    cleanUp();
    process.exit(INTERRUPTED);
  };
  const signals = ['SIGINT', 'SIGTERM'] as const;
  for (const signal of signals) process.on(signal, end);
  return () => {
    for (const signal of signals) process.off(signal, end);
  };
}

/**
 * What an earlier run left in the folder. @throws InputError `output/exists` when that is another run's,
 * without `force`
 */
export async function requireNoOtherRun({
  folder,
  files,
  runId,
  command,
  force,
  replacesLoneReport,
}: Pick<Results, 'folder' | 'runId' | 'command' | 'force' | 'replacesLoneReport'> & {
  readonly files: Iterable<readonly [name: string, content: unknown]>;
}): Promise<EarlierReport | undefined> {
  const earlier = await readEarlierReport(folder);
  const inTheWay = [...Array.from(files, ([name]) => name), REPORT_FILE].filter((name) =>
    existsSync(join(folder, name)),
  );
  if (inTheWay.length === 0 || earlier?.runId === runId || force) return earlier;
  const lone = inTheWay.length === 1 && earlier?.command === command && earlier.files.length === 0;
  if (replacesLoneReport === true && lone) return earlier;
  const shown = inTheWay.length <= 6 ? inTheWay.join(', ') : `${inTheWay.slice(0, 5).join(', ')}, ...`;
  throw new InputError(
    'output/exists',
    `the results of another run are there (${shown})`,
    'Choose another folder with --out, or replace them with --force.',
    { source: folder },
  );
}

function refuseReportName({ path }: NamedFile, folder: string): void {
  if (resolve(path) !== resolve(folder, REPORT_FILE)) return;
  throw new InputError(
    'output/exists',
    'this is the name of the report of this run',
    'Choose another name.',
    { source: path },
  );
}

/** What an earlier run left. */
interface EarlierReport {
  readonly runId: string;
  readonly command: string;
  /** Names of its files, without the report. */
  readonly files: readonly string[];
  /** The run came to its end, and all of its files are there. */
  readonly whole: boolean;
}

/**
 * What an earlier run left, or undefined. Only plain file names are believed: a report must not make us
 * remove anything else.
 */
async function readEarlierReport(folder: string): Promise<EarlierReport | undefined> {
  try {
    const report = JSON.parse(await readFile(join(folder, REPORT_FILE), 'utf8')) as Partial<EarlierReport> & {
      readonly interrupted?: boolean;
    };
    if (typeof report.runId !== 'string') return undefined;
    const names: readonly unknown[] = Array.isArray(report.files) ? report.files : [];
    const files = names.filter(
      (name): name is string =>
        typeof name === 'string' && name !== '' && basename(name) === name && !name.startsWith('.'),
    );
    return {
      runId: report.runId,
      command: String(report.command),
      files: files.filter((name) => name !== REPORT_FILE),
      whole: report.interrupted !== true && files.every((name) => existsSync(join(folder, name))),
    };
  } catch {
    return undefined;
  }
}

import { existsSync } from 'node:fs';
import { readFile, rename, rm } from 'node:fs/promises';
import { basename, join } from 'node:path';
import { InputError } from '../errors/InputError.js';
import { makeFolder, unwritable, writeTemporary } from './writeFile.js';

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
  /** Replace results of another run. */
  readonly force: boolean;
}

/**
 * Writes the results of a run: each file whole or not at all, the report last. Results of the same run (same `runId`)
 * are replaced, and so are, with `force`, those of another one, whose other files are removed. When anything fails, no new
 * folder is left behind.
 * @throws InputError `output/exists` when other results are in the way, `file/unwritable`
 */
export async function writeResults({ folder, files, report, runId, force }: Results): Promise<void> {
  const contents = [...files, [REPORT_FILE, report] as const];
  const earlier = await readEarlierReport(folder);
  const inTheWay = contents.map(([name]) => name).filter((name) => existsSync(join(folder, name)));
  if (inTheWay.length > 0 && earlier?.runId !== runId && !force) {
    throw new InputError(
      'output/exists',
      `the results of another run are there (${inTheWay.join(', ')})`,
      'Choose another folder with --out, or replace them with --force.',
      { source: folder },
    );
  }
  const madeFolder = await makeFolder(folder);
  const temporaries: string[] = [];
  try {
    for (const [name, content] of contents)
      temporaries.push(await writeTemporary(join(folder, name), content));
    if (earlier !== undefined && earlier.runId !== runId) {
      // The old report goes first and the new one comes last: at no moment does a report stand beside another run's files.
      for (const name of [REPORT_FILE, ...earlier.files]) await rm(join(folder, name), { force: true });
    }
    for (const [k, [name]] of contents.entries()) await rename(temporaries[k]!, join(folder, name));
  } catch (error) {
    for (const temporary of temporaries) await rm(temporary, { force: true });
    if (madeFolder !== undefined) await rm(madeFolder, { recursive: true, force: true });
    throw error instanceof InputError ? error : unwritable(folder, error);
  }
}

interface EarlierReport {
  readonly runId: string;
  readonly files: readonly string[];
}

/** What an earlier run left, or undefined. Only plain file names are believed: a report must not make us remove anything else. */
async function readEarlierReport(folder: string): Promise<EarlierReport | undefined> {
  try {
    const report = JSON.parse(await readFile(join(folder, REPORT_FILE), 'utf8')) as Partial<EarlierReport>;
    if (typeof report.runId !== 'string') return undefined;
    const names: readonly unknown[] = Array.isArray(report.files) ? report.files : [];
    const files = names.filter(
      (name): name is string =>
        typeof name === 'string' && name !== '' && basename(name) === name && !name.startsWith('.'),
    );
    return { runId: report.runId, files: files.filter((name) => name !== REPORT_FILE) };
  } catch {
    return undefined;
  }
}

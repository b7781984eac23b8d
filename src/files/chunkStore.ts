import { readdir, rename, rm, rmdir } from 'node:fs/promises';
import { dirname, join, resolve } from 'node:path';
import { InputError } from '../errors/InputError.js';
import type { Chunk } from './chunkFile.js';
import { decodeChunk, encodeChunk } from './chunkFile.js';
import { readInputFile } from './readInput.js';
import type { RunPlan } from './runPlan.js';
import { formatRunPlan, planDifferences, readRunPlan } from './runPlan.js';
import { makeFolder, unwritable, writeTemporary } from './writeFile.js';

/** Name of the folder, within that of the results, that holds the finished chunks of a run under way. */
export const PARTIAL_FOLDER = '.partial';

const PLAN_FILE = 'plan.json';
const CHUNK_NAME = /^chunk-(\d{6,15})\.bin$/;
const TEMPORARY_NAME = /^\..+\.(\d+)\.partial$/;

/** How a store is opened. */
export interface ChunkStoreOptions {
  /** Go on with the run whose chunks are there; without any, the run begins anew. */
  readonly resume: boolean;
  /** Begin anew where otherwise a refusal would be due: the chunks that are there are removed. */
  readonly force: boolean;
  /**
   * Writes beside a path, synced, and returns the temporary file's path; given in tests that fill the disk.
   */
  readonly writeTemporary?: (path: string, content: string | Uint8Array) => Promise<string>;
}

/** A chunk in the store, without its rows. */
export interface FinishedChunk {
  readonly number: number;
  readonly firstTrial: number;
  readonly rowCount: number;
}

/**
 * The finished chunks of one run on disk. Rows are not held in memory: the store is as small for a million
 * trials as for ten.
 */
export interface ChunkStore {
  /** The folder of the chunks. */
  readonly folder: string;
  /**
   * What opening found, in words for the person who runs it: chunks taken up, chunks that were damaged,
   * nothing to resume.
   */
  readonly notes: readonly string[];
  /** The chunks that are there, by ascending number. */
  finished(): readonly FinishedChunk[];
  has(number: number): boolean;
  /**
   * Keeps a chunk: once the promise is fulfilled, it outlives a kill of the process at any moment. A kill
   * before that leaves the whole chunk or none of it.
   * @throws InputError `file/unwritable` when the disk is full or the folder has gone; chunks saved before
   * are unharmed. RangeError for a chunk that is there already or has uneven rows
   */
  save(chunk: Chunk): Promise<void>;
  /** A chunk that is there, bit for bit as saved. @throws InputError `run/damaged`, `file/unreadable` */
  read(number: number): Promise<Chunk>;
  /** All chunks by ascending number, one in memory at a time. @throws as `read` */
  chunks(): AsyncGenerator<Chunk, void, undefined>;
  /**
   * Ends the use of the store. With `discard`, to be called when the results are written, its folder is
   * removed, and so are folders that it had to make and that are still empty; the same when no chunk was
   * finished. Otherwise all stays for a resume.
   */
  close(options: { readonly discard: boolean }): Promise<void>;
}

/**
 * Opens the store of a run in its results folder. It holds `.partial/plan.json`, written first, and one file
 * per finished chunk (see `encodeChunk`). Damaged and truncated chunks are removed and told in `notes`, to be
 * computed again; temporary files of processes that are no more are removed. Opening reads every chunk there
 * is once, one at a time. `resume` together with `force` goes on if it can and begins anew if it cannot.
 * @throws InputError `run/partial` when chunks are there and neither `resume` nor `force` is given,
 * `run/changed` when those there are of another run, `file/unwritable` (no new folder is left behind then),
 * `file/unreadable`
 */
export async function openChunkStore(
  folder: string,
  plan: RunPlan,
  options: ChunkStoreOptions,
): Promise<ChunkStore> {
  const partial = join(folder, PARTIAL_FOLDER);
  const found = await scan(partial, plan);
  const takenUp = takesUp(found, partial, plan, options);
  const made = await makeFolder(partial);
  const write = options.writeTemporary ?? writeTemporary;
  try {
    await removeAll(partial, takenUp ? found.useless : [...found.useless, ...found.wholeNames]);
    // The plan of another run is replaced only now, when no chunk of it is left to be taken for ours.
    if (!(takenUp && found.plan !== undefined)) {
      await writeWhole(write, join(partial, PLAN_FILE), formatRunPlan(plan));
    }
  } catch (error) {
    await removeEmptyFolders(partial, made);
    throw error;
  }
  const finished = takenUp ? found.whole : [];
  return new FolderStore(partial, plan, made, write, finished, openingNotes(found, takenUp, options));
}

/** What stands in the folder of a store. */
interface Findings {
  readonly plan: RunPlan | undefined;
  readonly whole: readonly FinishedChunk[];
  readonly wholeNames: readonly string[];
  /** Whole, but not of this run. */
  readonly foreignNames: readonly string[];
  /** What is wrong with chunks that are not whole or not of this run. */
  readonly damaged: readonly string[];
  /** Damaged and foreign chunks, and leftovers of temporary files. */
  readonly useless: readonly string[];
}

async function scan(partial: string, plan: RunPlan): Promise<Findings> {
  const whole: FinishedChunk[] = [];
  const wholeNames: string[] = [];
  const foreignNames: string[] = [];
  const damagedNames: string[] = [];
  const damaged: string[] = [];
  const leftovers: string[] = [];
  for (const name of await namesIn(partial)) {
    if (isLeftover(name)) leftovers.push(name);
    const number = Number(CHUNK_NAME.exec(name)?.[1]);
    if (!(number >= 1)) continue;
    const chunk = decodeChunk(await readInputFile(join(partial, name)), number, plan.columns, plan.runId);
    if (!('fault' in chunk)) {
      whole.push({ number, firstTrial: chunk.firstTrial, rowCount: chunk.rows.length / plan.columns });
      wholeNames.push(name);
      continue;
    }
    (chunk.fault === 'foreign' ? foreignNames : damagedNames).push(name);
    damaged.push(`chunk ${number} ${chunk.why}`);
  }
  whole.sort((a, b) => a.number - b.number);
  return {
    plan: await readRunPlan(join(partial, PLAN_FILE)),
    whole,
    wholeNames,
    foreignNames,
    damaged,
    useless: [...leftovers, ...damagedNames, ...foreignNames],
  };
}

/**
 * Sorted, so that everything told about the folder is told in the same order; empty when there is no such
 * folder.
 */
async function namesIn(folder: string): Promise<string[]> {
  try {
    return (await readdir(folder)).sort();
  } catch (error) {
    const { code } = error as NodeJS.ErrnoException;
    if (code === 'ENOENT' || code === 'ENOTDIR') return [];
    throw unwritable(folder, error);
  }
}

/** Temporary files of a process that still runs are its own business. */
function isLeftover(name: string): boolean {
  const writer = Number(TEMPORARY_NAME.exec(name)?.[1]);
  if (!Number.isSafeInteger(writer)) return false;
  if (writer === process.pid) return true;
  try {
    process.kill(writer, 0);
    return false;
  } catch (error) {
    return (error as NodeJS.ErrnoException).code === 'ESRCH';
  }
}

/**
 * Whether the chunks found are taken up; otherwise the run begins anew. Refuses where that would lose
 * something unasked.
 */
function takesUp(
  found: Findings,
  partial: string,
  plan: RunPlan,
  { resume, force }: ChunkStoreOptions,
): boolean {
  const { whole, foreignNames, damaged } = found;
  const otherPlan = found.plan !== undefined && !sameRun(found.plan, plan);
  // Without a plan the chunks speak for themselves: they bear the mark of their run.
  const another = otherPlan || (found.plan === undefined && foreignNames.length > 0);
  if (another) {
    if (force) return false;
    const difference = otherPlan ? planDifferences(found.plan, plan) : '';
    throw new InputError(
      resume ? 'run/changed' : 'run/partial',
      `the unfinished run that is kept there is another one${difference === '' ? '' : `: ${difference}`}`,
      resume
        ? 'Give the same inputs and options to go on with it, choose another folder with --out, or begin anew with --force.'
        : 'Choose another folder with --out, or begin anew with --force, which removes it.',
      { source: partial },
    );
  }
  if (resume) return true;
  if (force || whole.length + damaged.length === 0) return false;
  const trials = trialsIn(whole);
  throw new InputError(
    'run/partial',
    `an unfinished run is kept there (${trials} ${trials === 1 ? 'trial is' : 'trials are'} done)`,
    'Go on with it with --resume, or begin anew with --force.',
    { source: partial },
  );
}

function sameRun(a: RunPlan, b: RunPlan): boolean {
  return a.runId === b.runId && a.columns === b.columns;
}

function trialsIn(chunks: readonly FinishedChunk[]): number {
  return chunks.reduce((sum, { rowCount }) => sum + rowCount, 0);
}

function openingNotes(found: Findings, takenUp: boolean, { resume }: ChunkStoreOptions): string[] {
  if (!resume) return [];
  if (!takenUp) return ['the unfinished run that was kept is another one: this run begins anew'];
  const notes: string[] = [];
  const { whole, damaged } = found;
  if (damaged.length > 0) {
    const list =
      damaged.slice(0, 3).join(', ') + (damaged.length > 3 ? `, and ${damaged.length - 3} more` : '');
    notes.push(`a part of what was kept is damaged and is computed again: ${list}`);
  }
  const trials = trialsIn(whole);
  notes.push(
    trials === 0
      ? 'there is nothing to resume: the run begins anew'
      : `the run goes on: ${trials} ${trials === 1 ? 'trial is' : 'trials are'} done already`,
  );
  return notes;
}

type WriteTemporary = (path: string, content: string | Uint8Array) => Promise<string>;

async function writeWhole(write: WriteTemporary, path: string, content: string | Uint8Array): Promise<void> {
  const temporary = await write(path, content);
  try {
    await rename(temporary, path);
  } catch (error) {
    await rm(temporary, { force: true }).catch(() => undefined);
    throw unwritable(path, error);
  }
}

async function removeAll(folder: string, names: Iterable<string>): Promise<void> {
  for (const name of names) {
    try {
      await rm(join(folder, name), { force: true });
    } catch (error) {
      throw unwritable(join(folder, name), error);
    }
  }
}

/** Removes the folder and those above it up to `made`, as far as they are empty. */
async function removeEmptyFolders(folder: string, made: string | undefined): Promise<void> {
  if (made === undefined) return;
  const top = resolve(made);
  let current = resolve(folder);
  while (current.startsWith(top)) {
    try {
      await rmdir(current);
    } catch {
      return;
    }
    current = dirname(current);
  }
}

class FolderStore implements ChunkStore {
  private readonly byNumber = new Map<number, FinishedChunk>();
  private closed = false;

  constructor(
    readonly folder: string,
    private readonly plan: RunPlan,
    private readonly made: string | undefined,
    private readonly write: WriteTemporary,
    finished: readonly FinishedChunk[],
    readonly notes: readonly string[],
  ) {
    for (const chunk of finished) this.byNumber.set(chunk.number, chunk);
  }

  finished(): readonly FinishedChunk[] {
    return [...this.byNumber.values()].sort((a, b) => a.number - b.number);
  }

  has(number: number): boolean {
    return this.byNumber.has(number);
  }

  async save(chunk: Chunk): Promise<void> {
    const { number, firstTrial, rows } = chunk;
    if (this.closed) throw new RangeError('the chunk store is closed');
    if (this.byNumber.has(number)) throw new RangeError(`chunk ${number} is there already`);
    const bytes = encodeChunk(chunk, this.plan.columns, this.plan.runId);
    try {
      await writeWhole(this.write, this.pathOf(number), bytes);
    } catch (error) {
      throw this.keptBefore(error);
    }
    this.byNumber.set(number, { number, firstTrial, rowCount: rows.length / this.plan.columns });
  }

  async read(number: number): Promise<Chunk> {
    if (!this.byNumber.has(number)) throw new RangeError(`chunk ${number} is not there`);
    const path = this.pathOf(number);
    const chunk = decodeChunk(await readInputFile(path), number, this.plan.columns, this.plan.runId);
    if (!('fault' in chunk)) return chunk;
    throw new InputError(
      'run/damaged',
      `chunk ${number} of the run has been damaged since it was written: it ${chunk.why}`,
      'Run it once more with --resume: what is whole is kept, and the rest is computed again.',
      { source: path },
    );
  }

  async *chunks(): AsyncGenerator<Chunk, void, undefined> {
    for (const { number } of this.finished()) yield await this.read(number);
  }

  async close({ discard }: { readonly discard: boolean }): Promise<void> {
    if (this.closed) return;
    this.closed = true;
    if (!discard && this.byNumber.size > 0) return;
    const names = await namesIn(this.folder);
    const ours = names.filter((name) => CHUNK_NAME.test(name) || isLeftover(name));
    // The plan goes last: at every moment, what is left is a run that can be resumed.
    await removeAll(this.folder, [...ours, PLAN_FILE]);
    await removeEmptyFolders(this.folder, this.made ?? this.folder);
  }

  private pathOf(number: number): string {
    return join(this.folder, `chunk-${String(number).padStart(6, '0')}.bin`);
  }

  /** A fault of writing, with the consolation that belongs to it. */
  private keptBefore(error: unknown): unknown {
    if (!(error instanceof InputError) || this.byNumber.size === 0) return error;
    const trials = trialsIn([...this.byNumber.values()]);
    return new InputError(
      error.code,
      error.message,
      `Make room there and go on with --resume: the ${trials} trials before are kept.`,
      {},
      { cause: error },
    );
  }
}

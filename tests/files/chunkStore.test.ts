import {
  existsSync,
  mkdirSync,
  readdirSync,
  readFileSync,
  renameSync,
  truncateSync,
  writeFileSync,
} from 'node:fs';
import { rm } from 'node:fs/promises';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { InputError } from '../../src/errors/InputError.js';
import type { ChunkStore } from '../../src/files/chunkStore.js';
import { openChunkStore } from '../../src/files/chunkStore.js';
import { unwritable, writeTemporary } from '../../src/files/writeFile.js';
import { builtCopy } from './builtCopy.js';
import { freshFolder, startScript } from './runScript.js';
import { chunkOf, COLUMNS, PLAN, ROWS } from './workers/chunkContent.js';

const ANEW = { resume: false, force: false };
const RESUME = { resume: true, force: false };
const FORCE = { resume: false, force: true };

/** A results folder in which the chunks of these numbers are kept. */
async function folderWith(...numbers: readonly number[]): Promise<string> {
  const folder = join(freshFolder(), 'results');
  const store = await openChunkStore(folder, PLAN, ANEW);
  for (const number of numbers) await store.save(chunkOf(number));
  // Not closed, as a process that is killed does not.
  return folder;
}

function partial(folder: string, name = ''): string {
  return join(folder, '.partial', name);
}

function numbersIn(store: ChunkStore): number[] {
  return store.finished().map(({ number }) => number);
}

async function faultOf(promise: Promise<unknown>): Promise<InputError> {
  const error: unknown = await promise.then(
    () => undefined,
    (reason: unknown) => reason,
  );
  expect(error).toBeInstanceOf(InputError);
  return error as InputError;
}

describe('a store of chunks', () => {
  it('keeps chunks bit for bit for a run that goes on, in order of their numbers', async () => {
    const folder = await folderWith(3, 1, 2);
    const store = await openChunkStore(folder, PLAN, RESUME);
    expect(store.notes).toEqual([`the run goes on: ${3 * ROWS} trials are done already`]);
    expect(store.finished()).toEqual([
      { number: 1, firstTrial: 1, rowCount: ROWS },
      { number: 2, firstTrial: ROWS + 1, rowCount: ROWS },
      { number: 3, firstTrial: 2 * ROWS + 1, rowCount: ROWS },
    ]);
    const read = [];
    for await (const chunk of store.chunks()) read.push(chunk);
    expect(read).toEqual([chunkOf(1), chunkOf(2), chunkOf(3)]);
    expect([store.has(2), store.has(4)]).toEqual([true, false]);
    await expect(store.save(chunkOf(2))).rejects.toThrow(RangeError);
  });

  it('removes only what is its own, when the results are written', async () => {
    const folder = await folderWith(1, 2);
    writeFileSync(join(folder, 'trials.npy'), '');
    const store = await openChunkStore(folder, PLAN, RESUME);
    await store.close({ discard: true });
    expect(readdirSync(folder)).toEqual(['trials.npy']);
    await store.close({ discard: true });
    await expect(store.save(chunkOf(3))).rejects.toThrow(RangeError);
  });

  it('stays for a resume, unless nothing was finished: then no new folder is left', async () => {
    const folder = join(freshFolder(), 'a', 'b');
    const store = await openChunkStore(folder, PLAN, ANEW);
    await store.save(chunkOf(1));
    await store.close({ discard: false });
    expect(numbersIn(await openChunkStore(folder, PLAN, RESUME))).toEqual([1]);

    const above = freshFolder();
    const unused = await openChunkStore(join(above, 'a', 'b'), PLAN, ANEW);
    expect(existsSync(partial(join(above, 'a', 'b'), 'plan.json'))).toBe(true);
    await unused.close({ discard: false });
    expect(readdirSync(above)).toEqual([]);
  });

  it('is not begun anew over finished chunks without being told', async () => {
    const folder = await folderWith(1);
    const fault = await faultOf(openChunkStore(folder, PLAN, ANEW));
    expect(fault.code).toBe('run/partial');
    expect(fault.message).toContain(`${ROWS} trials are done`);
    expect(fault.remedy).toBe('Go on with it with --resume, or begin anew with --force.');
    expect(numbersIn(await openChunkStore(folder, PLAN, FORCE))).toEqual([]);
    // Nothing is lost now by beginning anew.
    expect((await openChunkStore(folder, PLAN, ANEW)).notes).toEqual([]);
  });

  it('refuses to go on with another run, and says what has changed', async () => {
    const folder = await folderWith(1, 2);
    const before = readdirSync(partial(folder));
    const other = { ...PLAN, runId: 'fedcba9876543210', description: { trials: 2000, sigma: 0.02, bits: 8 } };
    const fault = await faultOf(openChunkStore(folder, other, RESUME));
    expect(fault.code).toBe('run/changed');
    expect(fault.message).toContain('trials was 1000 and is 2000, bits was not given and is 8');
    expect(fault.remedy).toContain('--force');
    expect((await faultOf(openChunkStore(folder, other, ANEW))).code).toBe('run/partial');
    const wider = { ...PLAN, columns: COLUMNS + 1 };
    expect((await faultOf(openChunkStore(folder, wider, RESUME))).code).toBe('run/changed');
    expect(readdirSync(partial(folder))).toEqual(before);
    const forced = await openChunkStore(folder, other, { resume: true, force: true });
    expect([numbersIn(forced), forced.notes.length]).toEqual([[], 1]);
    expect((await faultOf(openChunkStore(folder, PLAN, RESUME))).code).toBe('run/changed');
  });

  it('goes on when resume and force are both given and it can', async () => {
    const folder = await folderWith(1, 2);
    expect(numbersIn(await openChunkStore(folder, PLAN, { resume: true, force: true }))).toEqual([1, 2]);
  });

  it('begins anew with a note when there is nothing to resume', async () => {
    const store = await openChunkStore(join(freshFolder(), 'new'), PLAN, RESUME);
    expect(store.notes).toEqual(['there is nothing to resume: the run begins anew']);
  });

  it('computes damaged chunks again and uses the whole ones', async () => {
    const folder = await folderWith(1, 2, 3, 4, 5);
    truncateSync(partial(folder, 'chunk-000002.bin'), 700);
    const bytes = readFileSync(partial(folder, 'chunk-000004.bin'));
    bytes[200]! ^= 4;
    writeFileSync(partial(folder, 'chunk-000004.bin'), bytes);
    truncateSync(partial(folder, 'chunk-000005.bin'), 0);
    const store = await openChunkStore(folder, PLAN, RESUME);
    expect(numbersIn(store)).toEqual([1, 3]);
    expect(store.notes[0]).toBe(
      'a part of what was kept is damaged and is computed again: chunk 2 is not what was written, ' +
        'chunk 4 is not what was written, chunk 5 ends too early',
    );
    for (const number of [2, 4, 5]) await store.save(chunkOf(number));
    expect(await store.read(4)).toEqual(chunkOf(4));
    expect((await openChunkStore(folder, PLAN, RESUME)).notes.length).toBe(1);
  });

  it('never takes a chunk of another run or number for its own', async () => {
    const folder = await folderWith(1, 2);
    const stray = await openChunkStore(freshFolder(), { ...PLAN, runId: 'other' }, ANEW);
    await stray.save(chunkOf(3));
    renameSync(join(stray.folder, 'chunk-000003.bin'), partial(folder, 'chunk-000003.bin'));
    renameSync(partial(folder, 'chunk-000002.bin'), partial(folder, 'chunk-000004.bin'));
    const store = await openChunkStore(folder, PLAN, RESUME);
    expect(numbersIn(store)).toEqual([1]);
    expect(store.notes[0]).toContain('chunk 3 is of another run');
  });

  it('lets the chunks speak when the plan is lost or damaged', async () => {
    for (const text of [undefined, '', '{"format": 1, "runId": "0123', '{"format": 2}', 'null']) {
      const folder = await folderWith(1, 2);
      if (text === undefined) await rm(partial(folder, 'plan.json'));
      else writeFileSync(partial(folder, 'plan.json'), text);
      const other = { ...PLAN, runId: 'other' };
      expect((await faultOf(openChunkStore(folder, other, RESUME))).code).toBe('run/changed');
      expect((await faultOf(openChunkStore(folder, other, ANEW))).code).toBe('run/partial');
      expect(numbersIn(await openChunkStore(folder, PLAN, RESUME))).toEqual([1, 2]);
      expect((await faultOf(openChunkStore(folder, PLAN, ANEW))).code).toBe('run/partial');
    }
  });

  it('tells when a chunk is damaged or lost after opening', async () => {
    const store = await openChunkStore(await folderWith(1, 2), PLAN, RESUME);
    truncateSync(join(store.folder, 'chunk-000001.bin'), 100);
    await rm(join(store.folder, 'chunk-000002.bin'));
    const fault = await faultOf(store.read(1));
    expect([fault.code, fault.remedy]).toEqual(['run/damaged', expect.stringContaining('--resume')]);
    expect((await faultOf(store.read(2))).code).toBe('file/unreadable');
    await expect(store.read(3)).rejects.toThrow(RangeError);
  });

  it('leaves the temporary files of a process that runs, and no others', async () => {
    const folder = await folderWith(1);
    const living = `.chunk-000002.bin.${process.ppid}.partial`;
    const own = `.chunk-000002.bin.${process.pid}.partial`;
    for (const name of [living, own]) writeFileSync(partial(folder, name), 'half');
    await openChunkStore(folder, PLAN, RESUME);
    expect(readdirSync(partial(folder)).sort()).toEqual([living, 'chunk-000001.bin', 'plan.json']);
  });
});

describe('a disk that is full', () => {
  /** Writes so many files, and then half a file before the disk is full. */
  function fullAfter(files: number): typeof writeTemporary {
    let left = files;
    return async (path, content) => {
      if (left-- > 0) return writeTemporary(path, content);
      writeFileSync(`${path}.half`, content.slice(0, content.length / 2));
      throw unwritable(path, Object.assign(new Error('no space'), { code: 'ENOSPC' }));
    };
  }

  it('loses no chunk that was kept before', async () => {
    const folder = freshFolder();
    const store = await openChunkStore(folder, PLAN, { ...ANEW, writeTemporary: fullAfter(3) });
    await store.save(chunkOf(1));
    await store.save(chunkOf(2));
    const fault = await faultOf(store.save(chunkOf(3)));
    expect(fault.code).toBe('file/unwritable');
    expect(fault.message).toMatch(/the disk is full$/);
    expect(fault.remedy).toBe(
      `Make room there and go on with --resume: the ${2 * ROWS} trials before are kept.`,
    );
    expect(store.has(3)).toBe(false);
    await store.close({ discard: false });
    const again = await openChunkStore(folder, PLAN, RESUME);
    expect(numbersIn(again)).toEqual([1, 2]);
    expect(again.notes.length).toBe(1);
  });

  it('leaves no new folder when not even the plan can be written', async () => {
    const above = freshFolder();
    const failing: typeof writeTemporary = (path) =>
      Promise.reject(unwritable(path, Object.assign(new Error('no space'), { code: 'ENOSPC' })));
    const opening = openChunkStore(join(above, 'a', 'b'), PLAN, { ...ANEW, writeTemporary: failing });
    expect((await faultOf(opening)).code).toBe('file/unwritable');
    expect(readdirSync(above)).toEqual([]);
  });

  it('is told like a folder that cannot be made or has gone', async () => {
    const folder = freshFolder();
    writeFileSync(join(folder, 'file'), '');
    expect((await faultOf(openChunkStore(join(folder, 'file'), PLAN, ANEW))).code).toBe('file/unwritable');
    mkdirSync(join(folder, 'taken'));
    writeFileSync(partial(join(folder, 'taken')), '');
    expect((await faultOf(openChunkStore(join(folder, 'taken'), PLAN, ANEW))).code).toBe('file/unwritable');
    const store = await openChunkStore(join(folder, 'gone'), PLAN, ANEW);
    await rm(join(folder, 'gone'), { recursive: true });
    expect((await faultOf(store.save(chunkOf(1)))).code).toBe('file/unwritable');
  });
});

describe('a process that is killed', () => {
  const copy = freshFolder();
  builtCopy(copy);

  it('at any moment leaves whole chunks, and the run that goes on gives the same bytes', async () => {
    const count = 120;
    const folder = join(freshFolder(), 'results');
    let kept = 0;
    for (const delay of [0, 1, 4, 9, 17, 31]) {
      const script = startScript(copy, 'chunkWriter', [folder, count]);
      // The first one at its first chunk, so that there is something to go on with on any disk.
      await script.printed(delay === 0 ? '1' : 'open');
      await new Promise((wake) => setTimeout(wake, delay));
      script.child.kill('SIGKILL');
      const { signal, lines, stderr } = await script.end;
      const told = lines.slice(1).map(Number);
      if (told.length + kept < count) expect([signal, stderr]).toEqual(['SIGKILL', '']);
      const store = await openChunkStore(folder, PLAN, RESUME);
      expect(store.notes).not.toContainEqual(expect.stringContaining('damaged'));
      for (const number of told) expect(store.has(number), String(number)).toBe(true);
      // One more may have been kept and not been told.
      expect(store.finished().length - kept - told.length).toBeLessThanOrEqual(1);
      for await (const chunk of store.chunks()) expect(chunk).toEqual(chunkOf(chunk.number));
      kept = store.finished().length;
    }
    const store = await openChunkStore(folder, PLAN, RESUME);
    for (let number = 1; number <= count; number++) {
      if (!store.has(number)) await store.save(chunkOf(number));
    }
    expect(kept).toBeGreaterThan(0);
    const resumed: Float64Array[] = [];
    for await (const chunk of store.chunks()) resumed.push(chunk.rows);
    expect(resumed).toEqual(Array.from({ length: count }, (_, k) => chunkOf(k + 1).rows));
  });

  it('in the middle of a file leaves no trace of it', async () => {
    const folder = freshFolder();
    const script = startScript(copy, 'chunkWriter', [folder, 3, 'hang']);
    await script.printed('hanging');
    script.child.kill('SIGKILL');
    await script.end;
    const leftover = `.chunk.${script.child.pid}.partial`;
    expect(readdirSync(partial(folder))).toContain(leftover);
    const store = await openChunkStore(folder, PLAN, RESUME);
    expect(numbersIn(store)).toEqual([1, 2]);
    expect(readdirSync(partial(folder))).not.toContain(leftover);
  });
});

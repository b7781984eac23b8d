import { readdirSync, readFileSync, rmSync, statSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { encodeChunk } from '../../src/files/chunkFile.js';
import { asRecord, freshFolder, runCommand, runMany } from './runCommand.js';
import { chunksIn, resultsIn, stopCommand } from './yieldRuns.js';

/** A search of some twenty values, two chunks of trials at each. */
const LONG = ['tolerance', 'dft(24)', '--trials', '2200', '--out', 'r'];
/** A search of five values, five chunks of trials at each: enough for workers. */
const BROAD = [
  ...['tolerance', 'dft(24)', '--source', 'bits', '--sigma', '0.003', '--trials', '9000', '--out', 'r'],
];

/** An undisturbed run, once for all tests. */
const undisturbed = (async () => {
  const { folder, code } = await runCommand([...LONG, '--quiet', '--workers', '2']);
  expect(code).toBe(0);
  return resultsIn(join(folder, 'r'));
})();

const RESULTS = ['r/', 'r/report.json', 'r/tolerance.csv', 'r/tolerance.svg'];

describe.concurrent('tolerance, interrupted', () => {
  it('ends Ctrl-C with the bracket so far, and goes on to the bytes of an undisturbed run', async () => {
    const folder = freshFolder();
    const results = join(folder, 'r');
    // In the middle of the sixth value.
    const stopped = await stopCommand(LONG, folder, 'SIGINT', () => chunksIn(results) >= 11);
    expect(stopped.code).toBe(130);
    const words =
      /^note: interrupted after (\d+) values, where the yield holds at sigma (\S+) and fails at sigma (\S+); go on with --resume$/m;
    expect(stopped.stderr).toMatch(words);
    const [, values, holds, fails] = words.exec(stopped.stderr)!;
    expect(Number(values)).toBeGreaterThanOrEqual(5);
    // A part of a search is no result.
    expect(readdirSync(results)).toEqual(['.partial']);

    // Unasked, what is kept is neither lost nor taken up.
    const refused = await runCommand(LONG, { folder });
    expect([refused.code, chunksIn(results) >= 11]).toEqual([2, true]);
    expect(refused.stderr).toMatch(
      /an unfinished run is kept there \(\d+ trials are done\)\nGo on with it with --resume, or begin anew with --force/,
    );

    const resumed = await runCommand([...LONG, '--resume', '--workers', '1'], { folder });
    expect(resumed.code).toBe(0);
    expect(resumed.stderr).toMatch(/the run goes on: \d+ trials are done already/);
    expect(resumed.listing).toEqual(RESULTS);
    expect(await resultsIn(results)).toEqual(await undisturbed);
    const { tolerance, tried } = asRecord(await resumed.read('r/report.json')) as unknown as {
      readonly tolerance: { readonly value: number };
      readonly tried: readonly unknown[];
    };
    expect(tolerance.value).toBeGreaterThan(Number(holds));
    expect(tolerance.value).toBeLessThan(Number(fails));
    expect(tried.length).toBeGreaterThan(Number(values));
  });

  it('goes on after kill -9 at any moment, again and again', async () => {
    const folder = freshFolder();
    const results = join(folder, 'r');
    // Before anything is there, in the middle of a value, between two, and later on.
    for (const least of [0, 1, 4, 7, 16]) {
      const killed = await stopCommand(
        [...LONG, '--resume', '--workers', '2'],
        folder,
        'SIGKILL',
        () => chunksIn(results) >= least,
      );
      expect(killed.code).toBeNull();
    }
    expect(chunksIn(results)).toBeGreaterThanOrEqual(16);
    const resumed = await runCommand([...LONG, '--resume', '--workers', '8'], { folder });
    expect([resumed.code, resumed.listing]).toEqual([0, RESULTS]);
    expect(await resultsIn(results)).toEqual(await undisturbed);
  });

  it('does the same with the chunks of several workers', async () => {
    const whole = await runCommand([...BROAD, '--quiet', '--workers', '1']);
    expect([whole.code, whole.stderr]).toEqual([0, '']);
    const folder = freshFolder();
    const results = join(folder, 'r');
    for (const least of [3, 8]) {
      const args = [...BROAD, '--resume', '--workers', '2'];
      const killed = await stopCommand(args, folder, 'SIGKILL', () => chunksIn(results) >= least);
      expect(killed.code).toBeNull();
    }
    const stopped = await stopCommand(
      [...BROAD, '--resume'],
      folder,
      'SIGINT',
      () => chunksIn(results) >= 20,
    );
    expect(stopped.code).toBe(130);
    // Halving from 24 on: 12 bits are enough, 6 are not.
    expect(stopped.stderr).toMatch(/values, where the yield holds at bits \d+ and fails at bits 6; go on/);
    const resumed = await runCommand([...BROAD, '--resume', '--workers', '8'], { folder });
    expect([resumed.code, resumed.listing]).toEqual([0, RESULTS]);
    expect(await resultsIn(results)).toEqual(await resultsIn(join(whole.folder, 'r')));
  });

  it('computes again what is damaged or has gone', async () => {
    const folder = freshFolder();
    const results = join(folder, 'r');
    await stopCommand(LONG, folder, 'SIGKILL', () => chunksIn(results) >= 8);
    rmSync(join(results, '.partial/chunk-000003.bin'));
    writeFileSync(join(results, '.partial/chunk-000005.bin'), 'nothing');
    const resumed = await runCommand([...LONG, '--resume'], { folder });
    expect(resumed.code).toBe(0);
    expect(resumed.stderr).toContain('is damaged and is computed again: chunk 5 ends too early');
    expect(await resultsIn(results)).toEqual(await undisturbed);
  });

  it('does not take a chunk of one value for that of another', async () => {
    const folder = freshFolder();
    const partial = join(folder, 'r/.partial');
    await stopCommand(LONG, folder, 'SIGKILL', () => chunksIn(join(folder, 'r')) >= 1);
    const { runId } = asRecord(readFileSync(join(partial, 'plan.json'), 'utf8')) as { runId: string };
    // Whole, of this run, with this number: only the value is another one.
    const chunk = { number: 1, firstTrial: 1, rows: new Float64Array(2116).fill(1), counters: [0, 0.25] };
    writeFileSync(join(partial, 'chunk-000001.bin'), encodeChunk(chunk, 1, runId));
    const resumed = await runCommand([...LONG, '--resume'], { folder });
    expect(resumed.code).toBe(2);
    expect(resumed.stderr).toMatch(
      /^error: chunk 1 of what is kept is of the value 0\.25, where this run tries 0\.01\nBegin anew with --force\.$/m,
    );
    const anew = await runCommand([...LONG, '--force'], { folder });
    expect(anew.code).toBe(0);
    expect(await resultsIn(join(folder, 'r'))).toEqual(await undisturbed);
  });

  it('does not take up the run of other inputs, says what has changed, and leaves it whole', async () => {
    const folder = freshFolder();
    const text = (sigma: number, more = ''): string =>
      `{"modes": 24, ${more} "process": {"sigma": ${sigma}, "phaseSigma": 0.001}}`;
    const files = { 'a.chip.json': text(0.01) };
    const args = ['tolerance', 'dft(24)', '--chip', 'a.chip.json', '--trials', '2200'];
    writeFileSync(join(folder, 'a.chip.json'), files['a.chip.json']);
    const results = join(folder, 'r');
    await stopCommand([...args, '--out', 'r'], folder, 'SIGKILL', () => chunksIn(results) >= 3);
    const kept = chunksIn(results);
    const changes: readonly (readonly [string[], RegExp])[] = [
      [['--trials', '2201'], /trials was 2200 and is 2201/],
      [['--error', 'phaseSigma=0.002'], /phaseSigma was 0\.001 and is 0\.002/],
      [['--threshold', 'fidelity=0.8'], /threshold was "fidelity=0\.99" and is "fidelity=0\.8"/],
      [['--seed', '7'], /seed was 2026 and is 7/],
      [['--retune', 'cell'], /retune was "none" and is "cell"/],
      [['--yield', '0.8'], /yield was 0\.9 and is 0\.8/],
      [['--source', 'bias'], /source was "sigma" and is "bias"/],
      [['--confidence', '0.9'], /confidence was 0\.95 and is 0\.9/],
    ];
    const there = [...args, '--resume', '--out', results];
    const runs = await runMany([
      ...changes.map(([options]) => ({ args: [...there, ...options], files })),
      { args: there, files: { 'a.chip.json': text(0.01, '"couplingRatio": 0.51,') } },
      // The same once more: the run can still be finished.
      { args: [...there, '--quiet'], files },
    ]);
    const told = [
      ...changes.map(([, words]) => words),
      /content of the chip was "sha256:\w+" and is "sha256:\w+"/,
    ];
    told.forEach((words, k) => {
      const { code, stdout, stderr } = runs[k]!;
      expect([code, stdout, stderr.trimEnd().split('\n').length]).toEqual([2, '', 2]);
      expect(stderr).toMatch(words);
      expect(stderr).toContain('Give the same inputs and options to go on with it');
    });
    expect(kept).toBeGreaterThanOrEqual(3);
    expect([runs.at(-1)!.code, runs.at(-1)!.stderr, chunksIn(results)]).toEqual([0, '', 0]);
  });

  it('goes on with a search of numbers of ports, whose chunks differ in size', async () => {
    const args = ['tolerance', 'dft(N)', '--source', 'modes', '--sigma', '0.014', '--trials', '2200'];
    const whole = await runCommand([...args, '--out', 'r', '--quiet']);
    expect([whole.code, whole.stderr]).toEqual([0, '']);
    const folder = freshFolder();
    const results = join(folder, 'r');
    const killed = await stopCommand(
      [...args, '--out', 'r'],
      folder,
      'SIGKILL',
      () => chunksIn(results) >= 9,
    );
    expect([killed.code, chunksIn(results) >= 9]).toEqual([null, true]);
    const resumed = await runCommand([...args, '--out', 'r', '--resume', '--quiet'], { folder });
    expect([resumed.code, resumed.stderr]).toEqual([0, '']);
    expect(await resultsIn(results)).toEqual(await resultsIn(join(whole.folder, 'r')));
  });
});

describe.concurrent('a finished run that is resumed', () => {
  const RUNS: readonly (readonly [string, readonly string[]])[] = [
    ['tolerance', ['tolerance', 'haar(4)', '--trials', '60', '--out', 'r']],
    ['yield', ['yield', 'haar(4)', '--sigma', '0.02', '--trials', '60', '--out', 'r']],
  ];
  it.each(RUNS)('%s: has nothing left to do, and says so', async (_, args) => {
    const { folder, code } = await runCommand([...args, '--quiet']);
    expect(code).toBe(0);
    const report = join(folder, 'r/report.json');
    const [before, written] = [readFileSync(report, 'utf8'), statSync(report).mtimeMs];
    const again = await runCommand([...args, '--resume'], { folder });
    expect([again.code, again.stdout, again.stderr]).toEqual([
      0,
      '',
      'the run is finished: its results are in r\n',
    ]);
    const json = await runCommand([...args, '--resume', '--json', '--quiet'], { folder });
    expect([json.code, json.stdout, json.stderr]).toEqual([0, before, '']);
    expect([statSync(report).mtimeMs, json.listing.includes('r/.partial/')]).toEqual([written, false]);

    // Another run is not this one, whatever it finds in its place.
    const other = await runCommand([...args, '--resume', '--seed', '5'], { folder });
    expect([other.code, other.stderr.trimEnd().split('\n').length]).toEqual([2, 2]);
    expect(other.stderr).toMatch(/^error: r: the results of another run are there/);
    expect(readFileSync(report, 'utf8')).toBe(before);

    // What is not all there is computed again, to the same bytes.
    const results = await resultsIn(join(folder, 'r'));
    rmSync(
      join(
        folder,
        'r',
        Object.keys(results).find((name) => name.endsWith('.svg'))!,
      ),
    );
    const mended = await runCommand([...args, '--resume'], { folder });
    expect(mended.stderr).toContain('there is nothing to resume: the run begins anew');
    expect(await resultsIn(join(folder, 'r'))).toEqual(results);
  });

  it('removes the chunks that a kill between the report and their removal has left', async () => {
    const folder = freshFolder();
    const results = join(folder, 'r');
    await stopCommand(LONG, folder, 'SIGKILL', () => chunksIn(results) >= 2);
    const whole = await runCommand([...LONG, '--quiet']);
    for (const name of ['report.json', 'tolerance.csv', 'tolerance.svg']) {
      writeFileSync(join(results, name), await whole.read(`r/${name}`));
    }
    const resumed = await runCommand([...LONG, '--resume'], { folder });
    expect([resumed.code, resumed.stderr, resumed.listing]).toEqual([
      0,
      'the run is finished: its results are in r\n',
      RESULTS,
    ]);
  });
});

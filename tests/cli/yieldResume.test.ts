import { copyFileSync, readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { asRecord, freshFolder, runCommand, runMany } from './runCommand.js';
import { chunksIn, readTable, resultsIn, stopCommand } from './yieldRuns.js';

/** A run of eight chunks. */
const LONG = ['yield', 'haar(24)', '--sigma', '0.01', '--trials', '2901', '--out', 'r'];

/** An undisturbed run, once for all tests. */
const undisturbed = (async () => {
  const { folder, code } = await runCommand([...LONG, '--quiet', '--workers', '2']);
  expect(code).toBe(0);
  return resultsIn(join(folder, 'r'));
})();

describe.concurrent('yield, interrupted', () => {
  it('ends Ctrl-C with the result so far, and goes on to the bytes of an undisturbed run', async () => {
    const folder = freshFolder();
    const results = join(folder, 'r');
    const stopped = await stopCommand(LONG, folder, 'SIGINT', () => chunksIn(results) >= 2);
    expect(stopped.code).toBe(130);
    expect(stopped.stderr).toMatch(/interrupted after (\d+) of 2901 trials; go on with --resume/);
    const [, done] = /interrupted after (\d+)/.exec(stopped.stderr)!;
    const report = asRecord(readFileSync(join(results, 'report.json'), 'utf8'));
    expect(report).toMatchObject({ interrupted: true, yield: { trials: Number(done) } });

    // What was reported are the first trials of the whole.
    const part = await readTable(join(results, 'trials.npy'));
    expect(part.shape).toEqual([Number(done), 1]);

    // Unasked, what is kept is neither lost nor taken up.
    const refused = await runCommand(LONG, { folder });
    expect([refused.code, chunksIn(results) >= 2]).toEqual([2, true]);
    expect(refused.stderr).toMatch(
      /an unfinished run is kept there \(\d+ trials are done\)\nGo on with it with --resume, or begin anew with --force/,
    );

    const resumed = await runCommand([...LONG, '--resume', '--workers', '1'], { folder });
    expect(resumed.code).toBe(0);
    expect(resumed.stderr).toMatch(/the run goes on: \d+ trials are done already/);
    expect(resumed.listing.filter((name) => name.startsWith('r/'))).toEqual([
      ...['r/', 'r/cumulative.svg', 'r/histogram.svg', 'r/report.json', 'r/trials.npy'],
    ]);
    expect(await resultsIn(results)).toEqual(await undisturbed);
    const whole = await readTable(join(results, 'trials.npy'));
    expect(part.values).toEqual(whole.values.subarray(0, part.values.length));
  });

  it('goes on after kill -9 at any moment, again and again', async () => {
    const folder = freshFolder();
    const results = join(folder, 'r');
    // Before anything is there, with the first chunk, and in the middle.
    let least = 0;
    for (const more of [0, 1, 2]) {
      least += more;
      const killed = await stopCommand(
        [...LONG, '--resume', '--workers', '2'],
        folder,
        'SIGKILL',
        () => chunksIn(results) >= least,
      );
      expect(killed.code).toBeNull();
      least = Math.max(least, chunksIn(results));
    }
    const resumed = await runCommand([...LONG, '--resume', '--workers', '8'], { folder });
    expect(resumed.code).toBe(0);
    expect(await resultsIn(results)).toEqual(await undisturbed);
  });

  it('does not take up the run of other inputs, says what has changed, and leaves it whole', async () => {
    const folder = freshFolder();
    const file = { 'a.chip.json': '{"modes": 24, "process": {"sigma": 0.01}}' };
    const args = ['yield', 'haar(24)', '--chip', 'a.chip.json', '--trials', '900'];
    writeFileSync(join(folder, 'a.chip.json'), file['a.chip.json']);
    const results = join(folder, 'r');
    await stopCommand([...args, '--out', 'r'], folder, 'SIGKILL', () => chunksIn(results) >= 1);
    const kept = chunksIn(results);
    const changes: readonly (readonly [string[], RegExp])[] = [
      [['--trials', '901'], /trials was 900 and is 901/],
      [['--error', 'sigma=0.02'], /sigma was 0\.01 and is 0\.02/],
      [['--threshold', 'fidelity=0.8'], /threshold was "fidelity=0\.99" and is "fidelity=0\.8"/],
      [['--seed', '7'], /seed was 2026 and is 7/],
      [['--retune', 'cell'], /retune was "none" and is "cell"/],
    ];
    const there = [...args, '--resume', '--out', results];
    const runs = await runMany([
      ...changes.map(([options]) => ({ args: [...there, ...options], files: file })),
      {
        args: there,
        files: { 'a.chip.json': '{"modes": 24, "couplingRatio": 0.51, "process": {"sigma": 0.01}}' },
      },
      // The same once more: the run can still be finished.
      { args: [...there, '--quiet'], files: file },
    ]);
    const told = [
      ...changes.map(([, words]) => words),
      /content of the chip was "sha256:\w+" and is "sha256:\w+"/,
    ];
    told.forEach((words, k) => {
      expect(runs[k]!.code).toBe(2);
      expect(runs[k]!.stderr).toMatch(words);
      expect(runs[k]!.stderr).toContain('Give the same inputs and options to go on with it');
    });
    expect(kept).toBeGreaterThanOrEqual(1);
    expect([runs.at(-1)!.code, runs.at(-1)!.stderr, chunksIn(results)]).toEqual([0, '', 0]);
  });

  it('says what has changed also where the part so far was reported', async () => {
    const folder = freshFolder();
    await stopCommand(LONG, folder, 'SIGINT', () => chunksIn(join(folder, 'r')) >= 1);
    const run = await runCommand([...LONG, '--resume', '--seed', '1'], { folder });
    expect([run.code, run.listing.includes('r/.partial/plan.json')]).toEqual([2, true]);
    expect(run.stderr).toContain('seed was 2026 and is 1');
  });

  it('goes on with a sweep', async () => {
    const args = ['yield', 'haar(24)', '--sweep', 'sigma=0.005:0.02:4', '--trials', '400', '--out', 'r'];
    const whole = await runCommand([...args, '--quiet']);
    const folder = freshFolder();
    const results = join(folder, 'r');
    await stopCommand(args, folder, 'SIGKILL', () => chunksIn(results) >= 1);
    // At the second point, and this time by Ctrl-C.
    const stopped = await stopCommand([...args, '--resume'], folder, 'SIGINT', () => chunksIn(results) >= 3);
    expect(stopped.code).toBe(130);
    expect(stopped.stderr).toContain('go on with --resume');
    const resumed = await runCommand([...args, '--resume'], { folder });
    expect(resumed.code).toBe(0);
    expect(await resultsIn(results)).toEqual(await resultsIn(join(whole.folder, 'r')));
  });

  it('computes a damaged chunk again', async () => {
    const folder = freshFolder();
    const results = join(folder, 'r');
    await stopCommand(LONG, folder, 'SIGKILL', () => chunksIn(results) >= 2);
    // A chunk in the place of another one is not what it says.
    copyFileSync(join(results, '.partial/chunk-000001.bin'), join(results, '.partial/chunk-000002.bin'));
    const resumed = await runCommand([...LONG, '--resume'], { folder });
    expect(resumed.code).toBe(0);
    expect(resumed.stderr).toContain('is damaged and is computed again: chunk 2');
    expect(await resultsIn(results)).toEqual(await undisturbed);
  });
});

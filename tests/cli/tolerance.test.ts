import { join } from 'node:path';
import { beforeAll, describe, expect, it } from 'vitest';
import type { CommandRun } from './runCommand.js';
import { asRecord, freshFolder, runCommand, runMany } from './runCommand.js';
import { resultsIn, stopCommand } from './yieldRuns.js';

interface ToleranceReport {
  readonly tolerance: {
    readonly value: number | null;
    readonly low: number | null;
    readonly high: number | null;
  };
  readonly theory: { readonly value: number | null };
  readonly tried: readonly { value: number; passed: number; trials: number; share: number }[];
}

describe('tolerance', () => {
  const files = { 'c.chip.json': '{"modes": 2, "process": {"sigma": 0.03, "phaseSigma": 0.001}}' };
  const CROSS = 'permutation([2,1])';
  const CALLS: Readonly<Record<string, string>> = {
    'angles': `${CROSS} --source sigmaAngle`,
    'bias': `${CROSS} --source bias --trials 40`,
    'haar': 'haar(8) --trials 500 --source sigma --yield 0.9 --threshold fidelity=0.99',
    'the same by default': 'haar(8) --trials 500',
    'retuned': 'haar(8) --trials 100 --retune cell',
    'loss': `${CROSS} --source lossSigmaDb --trials 50 --threshold transmission=0.5`,
    'with the process': 'dft(2) --chip c.chip.json --source phaseSigma --trials 300',
    'of the process itself': `${CROSS} --chip c.chip.json --source sigma --trials 300`,
    'nothing to lose': 'haar(1) --trials 40',
    'lost already': 'haar(3) --error phaseSigma=0.5 --trials 50',
    'few trials': 'haar(3) --trials 3',
  };
  const runs = new Map<string, CommandRun>();
  beforeAll(async () => {
    const names = Object.keys(CALLS);
    const calls = names.map((name) => ({
      args: ['tolerance', ...CALLS[name]!.split(' '), '--json', '--out', 'r'],
      files,
    }));
    (await runMany(calls)).forEach((run, k) => runs.set(names[k]!, run));
  });
  const runOf = (name: string): CommandRun => {
    const run = runs.get(name)!;
    expect([name, run.code]).toEqual([name, 0]);
    return run;
  };
  const report = (name: string): ToleranceReport => JSON.parse(runOf(name).stdout) as ToleranceReport;

  it('finds what can be worked out by hand: the cross state of one cell', () => {
    // F = cos^2(alpha + beta) of two normal angles: F >= 0.99 with probability 0.9 when 1.644854 sqrt(2) s =
    // acos(sqrt(0.99)).
    const exact = Math.acos(Math.sqrt(0.99)) / (1.644854 * Math.SQRT2);
    const { value, low, high } = report('angles').tolerance;
    expect(low).toBeLessThan(exact);
    expect(high).toBeGreaterThan(exact);
    // 2000 trials: the share at 0.9 is known to sqrt(0.09/2000), and falls by 0.4765 for a relative change of
    // s of 1 (2 z pdf(z), halved).
    const relative = Math.sqrt(0.09 / 2000) / (2 * 1.644854 * 0.103136);
    expect(Math.abs(value! / exact - 1)).toBeLessThan(4 * relative + 1e-3);
    expect(high! / low! - 1).toBeGreaterThan(2 * relative);
    expect(high! / low! - 1).toBeLessThan(6 * relative);
    // All chips alike: F = 4 k (1 - k) = 1 - 4 b^2 = 0.99 at a bias of 0.05, whatever the sampling.
    for (const end of Object.values(report('bias').tolerance).slice(1, 4)) expect(end).toBeCloseTo(0.05, 4);
  });

  it('reports what the contract names, beside the estimate in closed form', async () => {
    const run = runOf('haar');
    const whole = asRecord(run.stdout);
    expect(Object.keys(whole)).toEqual([
      ...['version', 'runId', 'command', 'target', 'chip', 'errors', 'retune', 'thresholds', 'tolerance'],
      ...['theory', 'tried', 'seed', 'seconds', 'files'],
    ]);
    expect(whole).toMatchObject({
      tolerance: { source: 'sigma', yield: 0.9, confidence: 0.95 },
      thresholds: [{ key: 'fidelity', limit: 0.99 }],
      files: ['tolerance.csv', 'tolerance.svg', 'report.json'],
    });
    expect(run.stdout).toBe(await run.read('r/report.json'));
    const { tolerance, theory, tried } = report('haar');
    // A mean infidelity of 2 (N - 1) s^2 with a scatter of 2.2/N from chip to chip, 1.2816 of which are
    // allowed for.
    const estimate = Math.sqrt(0.01 / (14 * (1 + (2.2 / 8) * 1.281552)));
    expect(theory.value).toBeCloseTo(estimate, 6);
    expect(Math.abs(tolerance.value! / estimate - 1)).toBeLessThan(0.05);
    expect([tolerance.low! < tolerance.value!, tolerance.value! < tolerance.high!]).toEqual([true, true]);
    // The same chips at each value: the share falls steadily.
    tried.slice(1).forEach((point, k) => expect(point.share).toBeLessThanOrEqual(tried[k]!.share));
    expect(tried.every(({ trials }) => trials === 500)).toBe(true);
    expect(report('the same by default').tolerance).toEqual(tolerance);
    const csv = (await run.read('r/tolerance.csv')).trimEnd().split('\n');
    expect([csv[0], csv.length]).toEqual(['value,passed,trials,share,low,high', tried.length + 1]);
    expect(await run.read('r/tolerance.svg')).toMatch(/^<svg[^]*<\/svg>\s*$/);
  });

  it('is what yield says: the share just below the value holds, and just above it does not', async () => {
    const { value } = report('haar').tolerance;
    const calls = [0.998, 1.002].map((factor) => ({
      args: [
        'yield',
        'haar(8)',
        '--trials',
        '500',
        '--sigma',
        String(value! * factor),
        '--json',
        '--out',
        'r',
      ],
      files: {},
    }));
    const [below, above] = (await runMany(calls)).map(
      ({ stdout }) => (asRecord(stdout)['yield'] as { readonly share: number }).share,
    );
    expect(below).toBeGreaterThanOrEqual(0.9);
    expect(above).toBeLessThanOrEqual(0.9);
  });

  it('takes other sources as the chip file has them, and begins its own at nothing', () => {
    // The process's own sigma does not count when it is the one that is looked for.
    const { value } = report('of the process itself').tolerance;
    const exact = Math.acos(Math.sqrt(0.99)) / (1.644854 * Math.SQRT2);
    expect(Math.abs(value! / exact - 1)).toBeLessThan(
      (4 * Math.sqrt(0.09 / 300)) / (2 * 1.644854 * 0.103136),
    );
    expect(asRecord(runOf('with the process').stdout)['errors']).toMatchObject({
      sigma: 0.03,
      phaseSigma: 0,
    });
    expect(report('with the process').tolerance.value).toBeGreaterThan(0);
    expect(report('with the process').theory.value).toBeNull();
  });

  it('allows far more where cells are retuned, and knows losses', () => {
    expect(report('retuned').tolerance.value).toBeGreaterThan(2 * report('haar').tolerance.value!);
    // Two losses of max(0, s z): 3 dB of them, with a probability of 0.1, need an s of some 1.5 dB.
    const { value } = report('loss').tolerance;
    expect(value).toBeGreaterThan(1);
    expect(value).toBeLessThan(3);
  });

  it('says when there is no bound, and when nothing is left', () => {
    expect(report('nothing to lose').tolerance).toMatchObject({ value: null, low: null, high: null });
    expect(report('lost already').tolerance).toMatchObject({ value: 0, low: 0, high: 0 });
    expect(runOf('lost already').stderr).toContain('the yield does not hold even without sigma');
    // Three chips do not prove a yield of 90 %, whatever the spread.
    expect(report('few trials').tolerance).toMatchObject({ low: 0 });
  });
});

describe.concurrent('tolerance, run by run', () => {
  it('prints a table with the seed, and the same bytes with 1 and 2 workers', async () => {
    const args = ['tolerance', 'dft(4)', '--trials', '300', '--out', 'r'];
    const [one, two] = await Promise.all([
      runCommand([...args, '--workers', '1']),
      runCommand([...args, '--workers', '2', '--quiet']),
    ]);
    expect([one.code, two.code, two.stdout, two.stderr]).toEqual([0, 0, '', '']);
    expect(one.stdout).toMatch(
      /^dft\(4\) on ideal rectangular 4: a yield of 90 % with fidelity ≥ 0.99 holds up to$/m,
    );
    expect(one.stdout).toMatch(
      /^source +value +low +high +theory\nsigma +0\.0\d+ +0\.0\d+ +0\.0\d+ +0\.0\d+$/m,
    );
    expect(one.stdout).toMatch(/seed 2026$/m);
    expect(one.stderr).toBe('written to r: tolerance.csv, tolerance.svg, report.json\n');
    expect(await resultsIn(join(one.folder, 'r'))).toEqual(await resultsIn(join(two.folder, 'r')));
  });

  it('ends Ctrl-C with 130 and writes nothing', async () => {
    const folder = freshFolder();
    const started = performance.now();
    const args = ['tolerance', 'haar(32)', '--trials', '20000'];
    const stopped = await stopCommand(args, folder, 'SIGINT', () => performance.now() - started > 1500);
    expect(stopped).toEqual({
      code: 130,
      stderr: 'note: interrupted before the tolerance was found\n',
    });
    expect((await runCommand(['--version'], { folder })).listing).toEqual([]);
  });
});

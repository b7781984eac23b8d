import { join } from 'node:path';
import { beforeAll, describe, expect, it } from 'vitest';
import type { CommandRun } from './runCommand.js';
import { asRecord, runCommand, runMany } from './runCommand.js';
import { resultsIn } from './yieldRuns.js';

interface ToleranceReport {
  readonly tolerance: {
    readonly outcome: string;
    readonly meaning: string;
    readonly ladder?: readonly number[];
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
  /** A spread of splitter angles that a yield of 0.9 stands with a correlation of 1/2 in the cell. */
  const PAIR_SPREAD = Math.acos(Math.sqrt(0.99)) / (1.644854 * Math.sqrt(3));
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
    'pairs': `${CROSS} --source pairCorrelation --error sigmaAngle=${PAIR_SPREAD}`,
    'die': `${CROSS} --source biasSigma`,
    'nominal ratio': `${CROSS} --source couplingRatio --sigma 1e-9 --trials 40`,
    'nominal ratio lost': `${CROSS} --source couplingRatio --sigma 0.4 --trials 40`,
    'loss of splitters': `${CROSS} --source lossDb --sigma 1e-9 --trials 40 --threshold transmission=0.9`,
    'loss that does no harm': `${CROSS} --source lossDb --sigma 1e-9 --trials 40`,
    'ports': 'haar(N) --source modes --sigma 0.02 --trials 500',
    'ports of a chip': 'haar(N) --chip c.chip.json --source modes --trials 30 --threshold fidelity=0.98',
    'too few ports': 'haar(N) --source modes --sigma 0.3 --trials 40',
    'lengths': 'haar(6) --source correlationLength --sigma 0.0245 --trials 1000',
    'all lengths': 'haar(3) --source correlationLength --sigma 0.001 --trials 20 --yield 0.5',
    'no length': 'haar(3) --source correlationLength --sigma 0.3 --trials 20',
    'bits': 'dft(3) --source bits --trials 100',
    'not enough bits': 'dft(3) --source bits --sigma 0.3 --trials 20',
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

  const endsOf = (name: string): (number | null)[] => {
    const { value, low, high } = report(name).tolerance;
    return [value, low, high];
  };

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
    for (const end of endsOf('bias')) expect(end).toBeCloseTo(0.05, 4);
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

  it('finds what can be worked out of correlations, die-wide errors and the design', () => {
    // F = cos^2(alpha + beta), and alpha + beta has the variance 2 s^2 (1 + c), c their correlation: s is such that
    // a share of 0.9 keeps 0.99 at c = 1/2. With z = 1.644854 there, the share falls by z pdf(z)/(1 + c) = 0.1131 c.
    const [pair, pairLow, pairHigh] = endsOf('pairs') as [number, number, number];
    expect(Math.abs(pair - 0.5)).toBeLessThan((4 * Math.sqrt(0.09 / 2000)) / 0.1131 + 1e-3);
    expect([pairLow < pair, pair < pairHigh]).toEqual([true, true]);
    // F = 1 - 4 b^2 for a bias b of both: at most 0.05, with probability 0.9 where 1.644854 s = 0.05.
    const relative = Math.sqrt(0.09 / 2000) / (2 * 1.644854 * 0.103136);
    expect(Math.abs((endsOf('die')[0]! * 1.644854) / 0.05 - 1)).toBeLessThan(4 * relative + 1e-3);
    // The cross state of a cell with two splitters of ratio k passes 4 k (1 - k): 0.99 at k = 0.55.
    for (const end of endsOf('nominal ratio')) expect(Math.abs(end! - 0.55)).toBeLessThan(1e-3 * 0.05 + 1e-7);
    // Two splitters lose 0.9 of the light with 10 log10(1/0.9) dB between them.
    for (const end of endsOf('loss of splitters')) {
      expect(Math.abs(end! / (-5 * Math.log10(0.9)) - 1)).toBeLessThan(1e-3);
    }
    // A loss that both ports have in common changes no fidelity.
    expect(report('loss that does no harm').tolerance).toMatchObject({
      outcome: 'holds everywhere',
      value: null,
      largestTried: 20,
    });
    // Rounding to b bits over a turn costs (N - 1) (2 pi)^2/(12 4^b), over many targets: for 3 ports 0.0064 at 5
    // bits and 0.026 at 4 (check-values section 2). Here it is one target, and one number for all chips.
    expect(report('bits').tolerance).toMatchObject({ outcome: 'found', value: 5 });
    for (const name of ['pairs', 'die', 'nominal ratio', 'loss of splitters', 'bits']) {
      expect([name, report(name).theory.value]).toEqual([name, null]);
    }
    expect(report('nominal ratio').tolerance.meaning).toBe(
      'the largest nominal coupling ratio, from 0.5 up, for which the yield holds',
    );
  });

  it('finds a number of ports, whole, up to which the yield holds, as theory says', async () => {
    const { tolerance, tried, theory } = report('ports');
    const value = tolerance.value!;
    expect(tolerance).toMatchObject({ outcome: 'found', largestTried: 256 });
    expect(tried.every((point) => Number.isInteger(point.value) && point.trials === 500)).toBe(true);
    // (N - 1) (1 + 1.2816 2.2/N) 2 s^2 = 0.01; the share of 500 chips moves the answer by one or so.
    const law = (modes: number): number => 8e-4 * (modes - 1) * (1 + (1.281552 * 2.2) / modes);
    expect(law(theory.value!)).toBeCloseTo(0.01, 8);
    expect(Math.abs(value - theory.value!)).toBeLessThan(1.5);
    const shareAt = (modes: number): number => tried.find((point) => point.value === modes)!.share;
    expect(shareAt(value)).toBeGreaterThanOrEqual(0.9);
    expect(shareAt(value + 1)).toBeLessThan(0.9);
    expect(tolerance.ladder!.slice(0, 5)).toEqual([2, 3, 4, 6, 8]);
    for (const rung of tolerance.ladder!)
      if (rung <= value) expect(shareAt(rung)).toBeGreaterThanOrEqual(0.9);
    // The same chips as those that yield samples at that number of ports.
    const [run] = await runMany([
      {
        args: ['yield', `haar(${value})`, '--sigma', '0.02', '--trials', '500', '--json', '--out', 'r'],
        files: {},
      },
    ]);
    expect((asRecord(run!.stdout)['yield'] as { readonly share: number }).share).toBe(shareAt(value));
    expect(asRecord(runOf('ports of a chip').stdout)).toMatchObject({
      errors: { sigma: 0.03, phaseSigma: 0.001 },
      theory: { value: null },
    });
  });

  it('finds the length of correlation up to which the yield holds at every length of a ladder', async () => {
    const { tolerance, tried } = report('lengths');
    const ladder = tolerance.ladder!;
    expect(ladder.slice(0, 8)).toEqual([0, 0.25, 0.375, 0.5, 0.75, 1, 1.5, 2]);
    // The farthest cells of the last rung are correlated by 0.99 and more: 6 columns and 6 ports.
    expect(Math.exp(-(6 + 3) / ladder.at(-1)!)).toBeGreaterThan(0.99);
    expect(tolerance).toMatchObject({ outcome: 'found', largestTried: ladder.at(-1)! });
    const value = tolerance.value!;
    const below = ladder.filter((rung) => rung <= value);
    const shareAt = (length: number): number => tried.find((point) => point.value === length)!.share;
    for (const rung of below) expect([rung, shareAt(rung) >= 0.9]).toEqual([rung, true]);
    expect(shareAt(ladder[below.length]!)).toBeLessThan(0.9);
    // As yield says, for the same chips.
    const calls = [0.998, 1.002].map((factor) => ({
      args: [
        ...['yield', 'haar(6)', '--trials', '1000', '--sigma', '0.0245', '--json', '--out', 'r'],
        ...['--error', `correlationLength=${value * factor}`],
      ],
      files: {},
    }));
    const [justBelow, justAbove] = (await runMany(calls)).map(
      ({ stdout }) => (asRecord(stdout)['yield'] as { readonly share: number }).share,
    );
    expect(justBelow).toBeGreaterThanOrEqual(0.9);
    expect(justAbove).toBeLessThanOrEqual(0.9);
    expect(tolerance.meaning).toContain(
      'the largest correlation length (cells) up to which the yield holds at every',
    );
    expect(tolerance.meaning).toContain('what lies beyond, where it may hold again, is not looked at');
    expect(report('lengths').theory.value).toBeNull();
    const { tolerance: all, tried: everyLength } = report('all lengths');
    expect(all).toMatchObject({ outcome: 'holds everywhere', value: null });
    expect(everyLength.map((point) => point.value)).toEqual(all.ladder);
    expect(await runOf('lengths').read('r/tolerance.svg')).toContain('at 0, without correlation');
  });

  it('says when there is no bound, and when nothing is left', () => {
    expect(report('nothing to lose').tolerance).toMatchObject({
      outcome: 'holds everywhere',
      value: null,
      low: null,
      high: null,
    });
    const lost = { outcome: 'holds nowhere', value: 0, low: 0, high: 0 };
    expect(report('lost already').tolerance).toMatchObject(lost);
    expect(runOf('lost already').stderr).toContain('the yield does not hold even without sigma');
    const half = { outcome: 'holds nowhere', value: 0.5, low: 0.5, high: 0.5 };
    expect(report('nominal ratio lost').tolerance).toMatchObject(half);
    expect(runOf('nominal ratio lost').stderr).toContain('does not hold even at couplingRatio 0.5');
    expect(report('too few ports').tolerance).toMatchObject(lost);
    expect(runOf('too few ports').stderr).toContain('the yield does not hold even with 2 ports');
    expect(report('no length').tolerance).toMatchObject(lost);
    expect(runOf('no length').stderr).toContain('the yield does not hold even without correlationLength');
    // No number of bits mends other errors, and there is no largest number either.
    const never = { outcome: 'holds nowhere', value: null, low: null, high: null };
    expect(report('not enough bits').tolerance).toMatchObject(never);
    expect(runOf('not enough bits').stderr).toContain('the yield does not hold even with 24 bits');
    // Three chips do not prove a yield of 90 %, whatever the spread.
    expect(report('few trials').tolerance).toMatchObject({ low: 0 });
  });
});

describe.concurrent('tolerance, run by run', () => {
  it('prints a table with the seed', async () => {
    const one = await runCommand(['tolerance', 'dft(4)', '--trials', '300', '--out', 'r']);
    expect(one.code).toBe(0);
    expect(one.stdout).toMatch(
      /^dft\(4\) on ideal rectangular 4: a yield of 90 % with fidelity ≥ 0.99 holds up to$/m,
    );
    expect(one.stdout).toMatch(
      /^source +value +low +high +theory\nsigma +0\.0\d+ +0\.0\d+ +0\.0\d+ +0\.0\d+$/m,
    );
    expect(one.stdout).toMatch(/seed 2026$/m);
    expect(one.stderr).toBe('written to r: tolerance.csv, tolerance.svg, report.json\n');
  });

  it('writes the same bytes with 1, 2 and 8 workers, several chunks at each value', async () => {
    const args = ['tolerance', 'dft(24)', '--source', 'bits', '--trials', '9000', '--out', 'r', '--quiet'];
    const [one, two, eight] = await Promise.all(
      ['1', '2', '8'].map(async (workers) => {
        const run = await runCommand([...args, '--workers', workers]);
        expect([run.code, run.stdout, run.stderr]).toEqual([0, '', '']);
        return resultsIn(join(run.folder, 'r'));
      }),
    );
    expect(two).toEqual(one);
    expect(eight).toEqual(one);
  });
});

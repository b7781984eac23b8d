import { existsSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import { beforeAll, describe, expect, it } from 'vitest';
import { readChip } from '../../src/chip/readChip.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import type { Merit } from '../../src/merit/merit.js';
import { runTrials } from '../../src/tolerance/runTrials.js';
import type { TrialPlan } from '../../src/tolerance/TrialPlan.js';
import type { CommandRun } from './runCommand.js';
import { asRecord, COMMAND, runCommand, runMany, runProgram } from './runCommand.js';
import { readTable, resultsIn, withoutTimes } from './yieldRuns.js';

interface YieldReport {
  readonly yield: {
    readonly passed: number;
    readonly trials: number;
    readonly share: number;
    readonly low: number;
    readonly high: number;
  };
  readonly fidelity: Block;
  readonly powerDistance: Block;
  readonly theory: { readonly meanInfidelity: number | null };
  readonly clamped: number;
  readonly errors: Record<string, unknown>;
}

interface Block {
  readonly mean: number;
  readonly standardError: number;
  readonly median: number;
  readonly quantiles: readonly { probability: number; value: number; low: number; high: number }[];
  readonly worst: { readonly value: number; readonly trial: number };
}

interface Mean {
  readonly mean: number;
  readonly standardError: number;
}

/** What a row of a budget costs. */
interface Cost {
  readonly infidelity: Mean;
  readonly yield: { readonly share: number };
}

function reportOf(text: string): YieldReport {
  return JSON.parse(text) as YieldReport;
}

/** P(at most k of n) for independent trials of probability p, by adding up the terms. */
function binomialCumulative(k: number, n: number, p: number): number {
  let [sum, term] = [0, (1 - p) ** n];
  for (let i = 0; i <= k; i++) {
    sum += term;
    term *= ((n - i) / (i + 1)) * (p / (1 - p));
  }
  return sum;
}

describe.concurrent('yield', () => {
  it('reports what the contract names, with the defaults, and agrees with an exact value of theory', async () => {
    const run = await runCommand(['yield', 'dft(2)', '--error', 'sigmaAngle=0.02', '--json', '--out', 'r']);
    expect(run.code).toBe(0);
    expect(run.stdout).toBe(await run.read('r/report.json'));
    const report = reportOf(run.stdout);
    expect(Object.keys(report)).toEqual([
      ...['version', 'runId', 'command', 'target', 'chip', 'errors', 'retune', 'yield', 'fidelity', 'theory'],
      ...['columns', 'seed', 'clamped', 'seconds', 'trialsPerSecond', 'files'],
    ]);
    expect(Object.keys(report.yield)).toEqual([
      ...['thresholds', 'passed', 'trials', 'share', 'low', 'high', 'confidence'],
    ]);
    expect(Object.keys(report.fidelity)).toEqual([
      ...['mean', 'standardError', 'median', 'quantiles', 'worst'],
    ]);
    expect(report).toMatchObject({
      command: 'yield',
      retune: 'none',
      yield: { thresholds: [{ key: 'fidelity', limit: 0.99 }], trials: 10_000, confidence: 0.95 },
      columns: ['fidelity'],
      clamped: 0,
      files: ['trials.npy', 'histogram.svg', 'cumulative.svg', 'report.json'],
    });
    // The exact Gaussian average for DFT2 with both angles spread by 0.02: expansion of exp(i alpha) by
    // characteristic functions.
    const { mean, standardError } = report.fidelity;
    expect(Math.abs(1 - mean - 7.9952021e-4)).toBeLessThan(4 * standardError);
    expect(standardError).toBeLessThan(2e-5);
    // The leading order with the next one, for N = 2: L = 2 s^2, L (1 - 5/6 L).
    expect(report.theory.meanInfidelity).toBeCloseTo(8e-4 * (1 - (5 / 6) * 8e-4), 12);
  });

  it('prints the yield with its interval, the figures and the seed; nothing but the result on stdout', async () => {
    const args = ['yield', 'haar(3)', '--error', 'phaseSigma=0.1', '--trials', '40', '--threshold'];
    const run = await runCommand([...args, 'powerDistance=0.05', '--out', 'r']);
    expect(run.stdout).toMatch(
      /^ideal rectangular 3: 40 sampled chips for haar\(3\), retuning: none, seed 2026$/m,
    );
    expect(run.stdout).toMatch(
      /^yield \S+ % \(\S+ % to \S+ % at 95 % confidence\): \d+ of 40 chips with power distance ≤ 0.05$/m,
    );
    expect(run.stdout).toMatch(/^fidelity: mean \S+ ± \S+, median \S+, worst \S+ \(trial \d+\)$/m);
    expect(run.stdout).toMatch(/^power distance: mean /m);
    // Phase errors are no splitter errors: no theory.
    expect(run.stdout).not.toMatch(/theory/);
    expect(reportOf(await run.read('r/report.json')).theory).toEqual({ meanInfidelity: null });
    expect(run.stderr).toBe('written to r: trials.npy, histogram.svg, cumulative.svg, report.json\n');
  });

  it('is silent with --quiet, prints the report alone with --json, and draws progress on a terminal only', async () => {
    const args = ['yield', 'haar(24)', '--sigma', '0.01', '--trials', '1500'];
    const quiet = await runCommand([...args, '--quiet']);
    expect([quiet.code, quiet.stdout, quiet.stderr]).toEqual([0, '', '']);
    const json = await runCommand([...args, '--json', '--quiet'], { folder: quiet.folder });
    expect([withoutTimes(json.stdout), json.stderr]).toEqual([
      withoutTimes(await json.read('out/yield-haar-24/report.json')),
      '',
    ]);
    if (!existsSync('/usr/bin/script')) return;
    // A terminal of its own (script of util-linux).
    const command = [process.execPath, COMMAND, ...args, '--out', 't'].map((word) => `'${word}'`).join(' ');
    const drawn = await runProgram('script', ['-qec', command, '/dev/null'], quiet.folder);
    expect(drawn.code).toBe(0);
    expect(drawn.stdout).toMatch(/\r\u001b\[K\d+ % {2}\d+ trials\/s {2}\d+ s left/);
    expect(drawn.stdout).toMatch(/\r\u001b\[K[^\r]*1500 sampled chips/);
  });

  it('writes the same bytes with 1, 2 and 8 workers, and stops --within on the same chunk', async () => {
    const args = ['yield', 'haar(24)', '--sigma', '0.014', '--out', 'r', '--quiet', '--threshold'];
    const within = [...args, 'fidelity=0.98', '--within', '0.1', '--trials', '4000'];
    const folders = await Promise.all(
      ['1', '2', '8'].map(async (workers) => {
        const run = await runCommand([...within, '--workers', workers]);
        expect([run.code, run.stderr]).toEqual([0, '']);
        return join(run.folder, 'r');
      }),
    );
    const [one, two, eight] = await Promise.all(folders.map(resultsIn));
    expect(two).toEqual(one);
    expect(eight).toEqual(one);
    const { trials, low, high } = reportOf(readFileSync(join(folders[0]!, 'report.json'), 'utf8')).yield;
    expect(high - low).toBeLessThanOrEqual(0.1);
    // It stopped, and not before a chunk less was too few: a share p of n trials leaves 2 z sqrt(p (1 -
    // p)/n), a little more if exact.
    expect(trials).toBeLessThan(4000);
    const [{ shape, values }] = await Promise.all([readTable(join(folders[0]!, 'trials.npy'))]);
    expect(shape).toEqual([trials, 1]);
    const passed = values.filter((value) => value >= 0.98).length;
    expect(passed).toBe(reportOf(readFileSync(join(folders[0]!, 'report.json'), 'utf8')).yield.passed);
  });
});

describe('yield, small runs', () => {
  const runs = new Map<string, CommandRun>();
  const MEASURED = JSON.stringify({
    modes: 4,
    layout: 'triangular',
    couplingRatio: 0.48,
    cellStyle: { internal: 'differential', external: 'lower-output', splitterForm: 'real' },
    portShifters: false,
    measuredCells: [{ cell: 3, couplingRatio: [0.45, 0.51], lossDb: [0.1, 0.2] }],
    lossDb: { splitter: 0.05, shifter: 0.1, column: 0.1, input: 1, output: [1, 1.2, 1, 1.3] },
    process: { sigma: 0.02, phaseSigma: 0.05, bits: 8, lossSigmaDb: 0.05, biasSigma: 0.01 },
  });
  const PLAIN = '{"modes": 3, "process": {"sigma": 0.03}}';
  const BOUND = '{"modes": 4, "shifterLimits": {"rangeRad": [0, 2.5]}, "process": {"sigma": 0.03}}';
  const files = { 'm.chip.json': MEASURED, 'p.chip.json': PLAIN, 'b.chip.json': BOUND };
  const ALL_FIGURES = [
    ...['fidelity=0.5', 'averageGateFidelity=0.5', 'portPhaseFreeFidelity=0.9', 'rmsError=1'],
    ...['worstCaseError=1', 'powerDistance=0.1', 'transmission=0.3', 'transmissionDb=-6'],
  ].flatMap((threshold) => ['--threshold', threshold]);
  const CORRELATED = '--sigma 0.022 --error phaseSigma=0.01 --error pairCorrelation=0.4';
  const CALLS: Readonly<Record<string, string>> = {
    'all figures': `yield haar(4,3) --chip m.chip.json --trials 33 --retune cell ${ALL_FIGURES.join(' ')}`,
    'half pass': 'yield haar(4) --sigma 0.035 --trials 201 --confidence 0.9',
    'both thresholds':
      'yield haar(4) --sigma 0.035 --trials 201 --threshold fidelity=0.99 --threshold powerDistance=0.04',
    'one trial': 'yield haar(2) --sigma 0.02 --trials 1',
    'one port': 'yield haar(1) --sigma 0.02 --trials 7',
    'large errors': 'yield dft(2) --sigma 0.5 --trials 2000',
    'large chip': 'yield haar(64) --sigma 0.02 --trials 8 --threshold fidelity=0.9',
    'from process': 'yield dft(3) --chip p.chip.json --trials 50',
    'from option': 'yield dft(3) --sigma 0.03 --trials 50',
    'over process': 'yield dft(3) --chip p.chip.json --error sigma=0.01 --trials 50',
    'not retuned': 'yield haar(6) --sigma 0.05 --trials 300',
    'cells retuned': 'yield haar(6) --sigma 0.05 --trials 300 --retune cell',
    'bound none': 'yield haar(4,3) --chip b.chip.json --trials 20',
    'bound cell': 'yield haar(4,3) --chip b.chip.json --trials 20 --retune cell',
    'N from the chip': 'yield haar(N) --chip p.chip.json --trials 50',
    'not reached': 'yield haar(2) --sigma 0.1 --trials 50 --within 0.01',
    'sweep sigma': 'yield haar(4) --sweep sigma=0.015:0.035:3 --trials 201',
    'sweep modes': 'yield dft(N) --sigma 0.02 --sweep modes=2:6:3 --trials 300',
    'sweep ratio': 'yield permutation([2,1]) --sigma 1e-7 --sweep couplingRatio=0.4:0.5:3 --trials 3',
    'sweep loss': 'yield dft(2) --sigma 1e-7 --sweep lossDb=0:0.4:3 --trials 3 --threshold transmission=0.9',
    'sweep bits': 'yield dft(3) --sweep bits=2:6:3 --trials 10',
    'budget': 'yield dft(4) --sigma 0.02 --error phaseSigma=0.02 --error bits=7 --budget --trials 400',
    'correlated budget': `yield haar(6) ${CORRELATED} --error correlationLength=4 --budget --trials 901`,
    'budget of one source': 'yield dft(3) --sigma 0.02 --error pairCorrelation=-0.5 --budget --trials 40',
    'correlated': `yield haar(6) ${CORRELATED} --error correlationLength=4 --trials 901`,
    'uncorrelated': `yield haar(6) ${CORRELATED} --trials 901`,
    'sigma alone': 'yield dft(4) --sigma 0.02 --trials 400',
    'phases alone': 'yield dft(4) --error phaseSigma=0.02 --trials 400',
  };
  beforeAll(async () => {
    const names = Object.keys(CALLS);
    const done = await runMany(
      names.map((name) => ({ args: [...CALLS[name]!.split(' '), '--json', '--out', 'r'], files })),
    );
    names.forEach((name, k) => runs.set(name, done[k]!));
  });

  const runOf = (name: string): CommandRun => {
    const run = runs.get(name)!;
    expect([name, run.code]).toEqual([name, 0]);
    return run;
  };
  const report = (name: string): YieldReport => reportOf(runOf(name).stdout);
  const rowsOf = (name: string): ReturnType<typeof readTable> =>
    readTable(join(runOf(name).folder, 'r/trials.npy'));

  it('writes rows that the library gives, one column per judged figure, and a summary of each', async () => {
    const { columns, seed, ...rest } = asRecord(runOf('all figures').stdout);
    const { shape, values } = await rowsOf('all figures');
    expect(shape).toEqual([33, 8]);
    const { chip } = readChip(new TextEncoder().encode(MEASURED));
    const plan: TrialPlan = {
      chip,
      target: haarUnitary(4, 3),
      errors: chip.process,
      retune: 'cell',
      seed: seed as number,
      figures: columns as (keyof Merit)[],
    };
    const { rows } = await runTrials(plan, 33);
    expect(values).toEqual(rows);
    for (const [k, key] of (columns as string[]).entries()) {
      const column = values.filter((_, at) => at % 8 === k);
      const { mean, median, worst } = rest[key] as Block;
      const upper = ['rmsError', 'worstCaseError', 'powerDistance'].includes(key);
      expect(mean).toBeCloseTo(column.reduce((sum, value) => sum + value, 0) / 33, 12);
      // Of an odd number of values the median is one of them.
      expect(median).toBe(column.slice().sort()[16]);
      expect(worst.value).toBe(upper ? Math.max(...column) : Math.min(...column));
      expect(column[worst.trial - 1]).toBe(worst.value);
    }
  });

  it('gives the interval of Clopper and Pearson: each end leaves half the rest of the probability', async () => {
    const { passed, trials, share, low, high } = report('half pass').yield;
    const { values } = await rowsOf('half pass');
    expect([passed, trials]).toEqual([values.filter((fidelity) => fidelity >= 0.99).length, 201]);
    expect(share).toBe(passed / 201);
    expect(passed).toBeGreaterThan(20);
    expect(1 - binomialCumulative(passed - 1, 201, low)).toBeCloseTo(0.05, 9);
    expect(binomialCumulative(passed, 201, high)).toBeCloseTo(0.05, 9);
    // One trial that is good: P = 0.025 at the lower end, and the upper one is 1.
    const one = report('one trial');
    expect(one.yield).toMatchObject({
      passed: 1,
      trials: 1,
      low: expect.closeTo(0.025, 12) as number,
      high: 1,
    });
    expect(one.fidelity.standardError).toBeNull();
  });

  it('counts chips that keep all thresholds', async () => {
    const { values, shape } = await rowsOf('both thresholds');
    expect(shape).toEqual([201, 2]);
    const rows = Array.from({ length: 201 }, (_, k) => [values[2 * k]!, values[2 * k + 1]!] as const);
    const { passed } = report('both thresholds').yield;
    expect(passed).toBe(rows.filter(([fidelity, distance]) => fidelity >= 0.99 && distance <= 0.04).length);
    expect(passed).toBeLessThan(report('half pass').yield.passed);
    // The same chips, here judged from their whole matrix: the last digit may differ.
    const { mean } = report('half pass').fidelity;
    expect(report('both thresholds').fidelity.mean).toBeCloseTo(mean, 13);
  });

  it('knows chips of one port, of 64, and errors so large that ratios are clamped', () => {
    expect(report('one port').fidelity.mean).toBe(1);
    // E[1 - F] = L (1 - c L), L = 2 (N - 1) s^2 = 0.0504, c about 1/2.
    const { mean, standardError } = report('large chip').fidelity;
    expect(Math.abs(1 - mean - 0.0504 * (1 - 0.0252))).toBeLessThan(4 * standardError + 5e-4);
    const { clamped } = report('large errors');
    // A normal number leaves one standard deviation with probability 0.3173 (4000 of them, 4 standard
    // deviations of the count).
    expect(Math.abs(clamped - 4000 * 0.3173)).toBeLessThan(4 * Math.sqrt(4000 * 0.3173 * 0.6827));
    expect(runOf('large errors').stderr).toContain(`${clamped} coupling ratios were clamped to [0, 1]`);
  });

  it('takes the process of the chip file, which options override', async () => {
    const fromProcess = await rowsOf('from process');
    expect(fromProcess.values).toEqual((await rowsOf('from option')).values);
    const over = report('over process');
    expect(over.errors).toMatchObject({ sigma: 0.01 });
    // Common random numbers: a third of the error is a ninth of the infidelity, to leading order.
    const ratio = (1 - over.fidelity.mean) / (1 - report('from process').fidelity.mean);
    expect(ratio).toBeGreaterThan(0.105);
    expect(ratio).toBeLessThan(0.12);
  });

  it('retunes cells, also where limits of shifters bind', () => {
    // Retuning leaves fourth powers of the spread: s^4 (2/3 (N^2 - 1) + 4 (N - 1)/N) = 1.7e-4 against 2 (N -
    // 1) s^2 = 2.5e-2.
    expect(1 - report('not retuned').fidelity.mean).toBeGreaterThan(0.02);
    expect(1 - report('cells retuned').fidelity.mean).toBeLessThan(0.001);
    // With phases out of range both fall far below; retuning works under the same limits.
    for (const name of ['bound none', 'bound cell']) {
      expect(report(name).fidelity.mean).toBeLessThan(0.9);
      expect(report(name).fidelity.mean).toBeGreaterThan(0.3);
    }
  });

  it('draws a new target for each trial from haar(N) without a seed', async () => {
    const { values } = await rowsOf('N from the chip');
    const one = await rowsOf('from process');
    // Same chips, other targets.
    expect(values.filter((value, k) => value !== one.values[k]).length).toBeGreaterThan(45);
    expect(asRecord(runOf('N from the chip').stdout)['target']).toMatchObject({
      source: 'haar(N)',
      modes: 3,
    });
  });

  it('says so when the interval stays wider than --within', () => {
    expect(runOf('not reached').stderr).toMatch(/the interval is 0\.\d+ wide after all 50 trials, not 0\.01/);
  });

  const sweepOf = (name: string): { value: number; share: number; fidelity: { mean: number } }[] =>
    asRecord(runOf(name).stdout)['sweep'] as ReturnType<typeof sweepOf>;

  it('sweeps an error source: a point is what a run at that value gives', async () => {
    const points = sweepOf('sweep sigma');
    expect(points.map(({ value }) => value)).toEqual([0.015, 0.025, 0.035]);
    const { share } = report('half pass').yield;
    expect(points[2]).toMatchObject({ share, fidelity: { mean: report('half pass').fidelity.mean } });
    expect(points[0]!.share).toBeGreaterThan(points[1]!.share);
    const csv = (await runOf('sweep sigma').read('r/sweep.csv')).trimEnd().split('\n');
    expect(csv).toHaveLength(4);
    expect(csv[0]).toBe('sigma,passed,trials,share,low,high,fidelityMean,fidelityStandardError');
    expect(csv[3]).toMatch(new RegExp(`^0\\.035,\\d+,201,${share},`));
    expect(await runOf('sweep sigma').read('r/sweep.svg')).toMatch(/^<svg[^]*<\/svg>\s*$/);
  });

  it('sweeps the design: ports, nominal ratio, loss and bits', () => {
    // 2 (N - 1) s^2 for each number of ports; 300 chips each, whose infidelities scatter by less than their
    // mean.
    for (const { value, fidelity } of sweepOf('sweep modes')) {
      const expected = 2 * (value - 1) * 4e-4;
      expect(Math.abs(1 - fidelity.mean - expected)).toBeLessThan((4 * 1.2 * expected) / Math.sqrt(300));
    }
    // The cross state of a cell with both splitters at k passes 4 k (1 - k) of the light.
    for (const { value, fidelity } of sweepOf('sweep ratio')) {
      expect(fidelity.mean).toBeCloseTo(4 * value * (1 - value), 6);
    }
    // Two splitters of 0, 0.2 and 0.4 dB: 1, 0.912 and 0.832 are left.
    expect(sweepOf('sweep loss').map(({ share }) => share)).toEqual([1, 1, 0]);
    const bits = sweepOf('sweep bits');
    expect(bits.map(({ value }) => value)).toEqual([2, 4, 6]);
    expect(bits[2]!.fidelity.mean).toBeGreaterThan(bits[1]!.fidelity.mean);
    expect(bits[1]!.fidelity.mean).toBeGreaterThan(bits[0]!.fidelity.mean);
  });

  it('ranks error sources by what each costs alone', async () => {
    const { budget, together } = asRecord(runOf('budget').stdout) as unknown as {
      readonly together: { infidelity: { mean: number } };
      readonly budget: readonly { source: string; alone: { infidelity: { mean: number } } }[];
    };
    const alone = new Map(budget.map(({ source, alone: cost }) => [source, cost.infidelity.mean]));
    expect(alone.get('sigma')).toBeCloseTo(1 - report('sigma alone').fidelity.mean, 14);
    expect(alone.get('phaseSigma')).toBeCloseTo(1 - report('phases alone').fidelity.mean, 14);
    const costs = budget.map((row) => row.alone.infidelity.mean);
    expect(costs).toEqual(costs.slice().sort((a, b) => b - a));
    expect(together.infidelity.mean).toBeGreaterThan(costs[0]!);
    expect(await runOf('budget').read('r/budget.csv')).toMatch(/^source,aloneInfidelity,/);
    expect(await runOf('budget').read('r/budget.svg')).toMatch(/^<svg/);
  });

  it('shows what would be left without each correlation, and what it changes', async () => {
    const { budget, together, correlations } = asRecord(runOf('correlated budget').stdout) as unknown as {
      readonly together: Cost;
      readonly budget: readonly { source: string; alone: Cost; without: Cost }[];
      readonly correlations: readonly { source: string; without: Cost; change: Record<string, Mean> }[];
    };
    // Rows of sources are as they were: no correlation stands among them.
    expect(budget.map(({ source }) => source)).toEqual(['sigma', 'phaseSigma']);
    expect(correlations.map(({ source }) => source).sort()).toEqual(['correlationLength', 'pairCorrelation']);
    const row = correlations.find(({ source }) => source === 'correlationLength')!;
    // The same chips as runs of their own.
    const [before, after] = ['uncorrelated', 'correlated'].map(report) as [YieldReport, YieldReport];
    expect(row.without.infidelity.mean).toBeCloseTo(1 - before.fidelity.mean, 14);
    expect(row.without.yield.share).toBe(before.yield.share);
    expect(together.infidelity.mean).toBeCloseTo(1 - after.fidelity.mean, 14);
    // Trial by trial, with the textbook standard error of a difference of pairs.
    const [rowsBefore, rowsAfter] = [
      (await rowsOf('uncorrelated')).values,
      (await rowsOf('correlated')).values,
    ];
    const good = (fidelity: number): number => (fidelity >= 0.99 ? 1 : 0);
    const pairs: Record<string, Float64Array> = {
      infidelity: rowsBefore.map((fidelity, k) => fidelity - rowsAfter[k]!),
      yield: rowsAfter.map((fidelity, k) => good(fidelity) - good(rowsBefore[k]!)),
    };
    for (const [key, differences] of Object.entries(pairs)) {
      const mean = differences.reduce((sum, each) => sum + each, 0) / 901;
      const squares = differences.reduce((sum, each) => sum + (each - mean) ** 2, 0);
      expect(row.change[key]!.mean).toBeCloseTo(mean, 13);
      expect(row.change[key]!.standardError).toBeCloseTo(Math.sqrt(squares / 900 / 901), 13);
    }
    // Errors that neighbours have in common scatter more from chip to chip, and fewer chips are good.
    expect(row.change['yield']!.mean).toBeLessThan(-4 * row.change['yield']!.standardError);
    const csv = (await runOf('correlated budget').read('r/budget.csv')).trimEnd().split('\n');
    expect(csv).toHaveLength(1 + 2 + 2 + 2);
    const { infidelity, yield: share } = row.without;
    expect(csv).toContain(
      `correlationLength,,,,${infidelity.mean},${infidelity.standardError},${share.share}`,
    );
    expect(await runOf('correlated budget').read('r/budget.svg')).toContain('correlationLength left out');
    // Without correlations nothing is said of them; one source and one correlation are two to compare.
    expect(asRecord(runOf('budget').stdout)).not.toHaveProperty('correlations');
    const one = asRecord(runOf('budget of one source').stdout) as unknown as {
      readonly budget: readonly unknown[];
      readonly correlations: readonly { readonly source: string }[];
    };
    expect([one.budget.length, one.correlations.map(({ source }) => source)]).toEqual([
      1,
      ['pairCorrelation'],
    ]);
  });

  it('leaves no chunks behind', () => {
    for (const [name, { listing }] of runs) {
      expect([name, listing.filter((file) => file.includes('.partial'))]).toEqual([name, []]);
    }
  });
});

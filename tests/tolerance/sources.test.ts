import { describe, expect, it } from 'vitest';
import { layersIn } from '../support/ziggurat.js';
import type { ProcessErrors } from '../../src/chip/Chip.js';
import { REFERENCE_STYLE } from '../../src/chip/idealChip.js';
import { loadKernels } from '../../src/kernel/loadKernels.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import { innerProduct } from '../../src/matrix/products.js';
import { LAYOUTS } from '../../src/mesh/Mesh.js';
import { STREAMS } from '../../src/random/streams.js';
import { kolmogorovTest } from '../../src/statistics/kolmogorov.js';
import { normalCdf } from '../../src/statistics/normalDistribution.js';
import type { SampledChip } from '../../src/tolerance/createTrialEngine.js';
import { createTrialEngine } from '../../src/tolerance/createTrialEngine.js';
import { runTrials } from '../../src/tolerance/runTrials.js';
import type { TrialPlan } from '../../src/tolerance/TrialPlan.js';
import { dft, maxDifference } from '../support/matrices.js';
import { planFor, runPlan, sampleOf } from './trialPlans.js';

/** The first chips of a plan. */
function samples(plan: TrialPlan, trials: number): SampledChip[] {
  const engine = createTrialEngine(plan);
  return Array.from({ length: trials }, (_, trial) => engine.sample(trial));
}

/** The probability of a comparison to fail by chance that goes with 4 standard errors. */
const RARE = 6e-5;

describe('each source', () => {
  const modes = 5;
  const everything: Partial<ProcessErrors> = {
    sigma: 0.02,
    sigmaAngle: 0.03,
    bias: 0.01,
    biasSigma: 0.02,
    phaseSigma: 0.04,
    lossSigmaDb: 0.3,
  };

  it('has numbers of its own, which no other source changes', () => {
    const nominal = samples(planFor(modes, {}), 1)[0]!;
    const full = samples(planFor(modes, everything), 6);
    for (const source of Object.keys(everything) as (keyof ProcessErrors)[]) {
      const alone = samples(planFor(modes, { [source]: everything[source] }), 6);
      const withoutIt = samples(planFor(modes, { ...everything, [source]: 0 }), 6);
      alone.forEach(({ chip, settings }, trial) => {
        // What it does not touch is nominal when it is alone, and what it is with the others.
        const both = [
          [chip, nominal.chip, settings, nominal.settings],
          [withoutIt[trial]!.chip, full[trial]!.chip, withoutIt[trial]!.settings, full[trial]!.settings],
        ] as const;
        for (const [one, other, oneSettings, otherSettings] of both) {
          if (source !== 'phaseSigma') expect(oneSettings).toEqual(otherSettings);
          if (source !== 'lossSigmaDb') expect(one.cellLoss).toEqual(other.cellLoss);
          if (source === 'phaseSigma' || source === 'lossSigmaDb') {
            expect(one.couplingRatios).toEqual(other.couplingRatios);
          }
        }
        if (source === 'phaseSigma') expect(settings).toEqual(full[trial]!.settings);
        if (source === 'lossSigmaDb') expect(chip.cellLoss).toEqual(full[trial]!.chip.cellLoss);
      });
    }
  });

  it('adds the same to the ratios, alone or with others', () => {
    const angle = (k: number): number => Math.asin(Math.sqrt(k));
    const ratiosOf = (errors: Partial<ProcessErrors>): Float64Array =>
      samples(planFor(modes, errors), 4)[3]!.chip.couplingRatios;
    const ratio = ratiosOf({ sigma: 0.02 });
    const turned = ratiosOf({ sigmaAngle: 0.03 });
    const die = ratiosOf({ biasSigma: 0.02 });
    ratiosOf({ sigma: 0.02, sigmaAngle: 0.03, bias: 0.01, biasSigma: 0.02 }).forEach((found, k) => {
      const drawn = ratio[k]! + (die[k]! - 0.5) + 0.01;
      const expected = angle(drawn) + (angle(turned[k]!) - Math.PI / 4);
      expect(angle(found)).toBeCloseTo(expected, 13);
    });
  });
});

describe('the ratios of splitters', () => {
  it.each([
    ['normal', normalCdf],
    ['uniform', (x: number) => Math.min(1, Math.max(0, (x / Math.sqrt(3) + 1) / 2))],
  ] as const)('have a %s spread of sigma around what is nominal', (distribution, cdf) => {
    const chip = {
      ...planFor(6, {}).chip,
      couplingRatios: Float64Array.from({ length: 30 }, (_, k) => 0.4 + k / 200),
    };
    const errors = { sigma: 0.03, distribution };
    const deviations = samples(planFor(6, errors, { chip }), 300).flatMap((sampled) =>
      Array.from(sampled.chip.couplingRatios, (ratio, k) => (ratio - chip.couplingRatios[k]!) / 0.03),
    );
    expect(kolmogorovTest(Float64Array.from(deviations), cdf).pValue).toBeGreaterThan(RARE);
  });

  it('are shifted all alike by a bias, and from die to die by a spread of it', () => {
    const chips = samples(planFor(4, { bias: 0.02, biasSigma: 0.03 }), 1000);
    const shifts = chips.map(({ chip }) => chip.couplingRatios[0]! - 0.5);
    chips.forEach(({ chip: { couplingRatios } }) => {
      expect(Math.max(...couplingRatios) - Math.min(...couplingRatios)).toBeLessThan(1e-15);
    });
    const scaled = Float64Array.from(shifts, (shift) => (shift - 0.02) / 0.03);
    expect(kolmogorovTest(scaled, normalCdf).pValue).toBeGreaterThan(RARE);
  });

  // One balanced cell, both angles off by x: F = cos^4 x (exact); sin 2x = 2 delta, so cos^2 x = (1 + sqrt(1
  // - 4 delta^2))/2, averaged over the normal delta by a sum of rectangles.
  it('that a die shares cost what the integral over the die says', () => {
    const spread = 0.05;
    const steps = Array.from({ length: 2001 }, (_, k) => (k - 1000) / 125);
    const weights = steps.map((x) => Math.exp((-x * x) / 2));
    const total = weights.reduce((sum, weight) => sum + weight, 0);
    const expected = steps.reduce((sum, x, k) => {
      const power = (1 + Math.sqrt(1 - 4 * (spread * x) ** 2)) / 2;
      return sum + (weights[k]! / total) * power ** 2;
    }, 0);
    const { rows } = runPlan(planFor(2, { biasSigma: spread }, { target: dft(2) }), 40_000);
    const { mean, standardError } = sampleOf(rows);
    expect(Math.abs(mean - expected)).toBeLessThan(4 * standardError);
    expect(standardError).toBeLessThan(0.02 * (1 - expected));
  });

  // Two splitters of a cell: pairCorrelation. Splitters of two cells: exp(-d/L), a column being one cell wide
  // and two ports one cell high.
  it.each(
    LAYOUTS.flatMap((layout) => [
      [layout, 2, 0.5] as const,
      [layout, 3, 0.5] as const,
      // Opposite to each other as far as three can be.
      [layout, 3, -0.5] as const,
    ]),
  )('are correlated along the mesh and within cells, %s, %i splitters, %f', (layout, splitters, pair) => {
    const [length, sigma, trials] = [2, 0.01, 4000];
    const errors = { sigma, correlationLength: length, pairCorrelation: pair };
    const plan = planFor(5, errors, {}, { layout, style: { ...REFERENCE_STYLE, splitters } });
    const { cells, columnIndex, upperPortIndex } = plan.chip.mesh;
    const deviations = samples(plan, trials).map(({ chip }) =>
      chip.couplingRatios.map((ratio) => (ratio - 0.5) / sigma),
    );
    const correlation = (a: number, b: number): number =>
      deviations.reduce((sum, each) => sum + each[a]! * each[b]!, 0) / trials;
    for (let a = 0; a < cells; a++) {
      for (let b = 0; b <= a; b++) {
        const columns = Math.abs(columnIndex[a]! - columnIndex[b]!);
        const rows = Math.abs(upperPortIndex[a]! - upperPortIndex[b]!) / 2;
        const local = Math.exp(-(columns + rows) / length);
        for (let k = 0; k < splitters; k++) {
          for (let l = 0; l < splitters; l++) {
            const [i, j, expected] = [splitters * a + k, splitters * b + l, k === l ? local : pair * local];
            const standardError = Math.sqrt((1 + expected ** 2) / trials);
            expect(Math.abs(correlation(i, j) - expected), `${i}, ${j}`).toBeLessThan(4.5 * standardError);
          }
        }
      }
    }
  });
});

describe('ratios beyond 0 and 1', () => {
  // The numbers of the splitters' own stream, drawn by the kernels outside of the engine.
  it('are clamped, each counted once, of those trials only that were asked for', () => {
    const [modes, sigma, bias] = [5, 0.3, 0.05];
    const seed = 2 ** 33 + 5;
    const plan = planFor(modes, { sigma, bias }, { seed });
    const splitters = modes * (modes - 1);
    const instance = loadKernels();
    const state = instance.reserve(4);
    const out = instance.reserve(2 * splitters);
    const layers = layersIn(instance);
    const drawn = instance.doubles(out, 2 * splitters);
    const engine = createTrialEngine(plan);
    let total = 0;
    for (const [first, count] of [
      [0, 1],
      [1, 2],
      [3, 5],
      [8, 4],
    ] as const) {
      let expected = 0;
      for (let trial = first; trial < first + count; trial++) {
        instance.kernels.seedTrials(state, 5, 2, STREAMS.splitterRatios, trial);
        instance.kernels.fillNormals(out, splitters, state, layers);
        const { couplingRatios } = engine.sample(trial).chip;
        for (let k = 0; k < splitters; k++) {
          const ratio = 0.5 + bias + sigma * drawn[2 * k]!;
          if (!(ratio >= 0 && ratio <= 1)) expected++;
          expect(couplingRatios[k]).toBeCloseTo(Math.min(1, Math.max(0, ratio)), 13);
        }
      }
      expect(engine.run(first, count, new Float64Array(count))).toBe(expected);
      total += expected;
    }
    expect(total).toBeGreaterThan(10);
    expect(engine.run(0, 12, new Float64Array(12))).toBe(total);
  });

  it('are as many as the normal distribution says', () => {
    const [trials, modes, sigma] = [2000, 8, 0.25];
    const { clamped } = runPlan(planFor(modes, { sigma }), trials);
    const share = 2 * normalCdf(-0.5 / sigma);
    const draws = trials * modes * (modes - 1);
    expect(Math.abs(clamped - share * draws)).toBeLessThan(4 * Math.sqrt(draws * share * (1 - share)));
  });

  it('are none for small errors, and none for angles', () => {
    expect(runPlan(planFor(4, { sigma: 0.02 }), 100).clamped).toBe(0);
    expect(runPlan(planFor(4, { sigmaAngle: 2 }), 100).clamped).toBe(0);
  });
});

describe('losses that vary', () => {
  // One cell: its loss in dB is the sum of two, each normal around what is nominal.
  it('add up in dB, as a normal around what is nominal', () => {
    const base = planFor(2, { lossSigmaDb: 0.1 }, { figures: ['transmissionDb', 'fidelity'] });
    const chip = { ...base.chip, loss: { ...base.chip.loss, splitter: 10 ** (-0.6 / 20) } };
    const { rows } = runPlan({ ...base, chip }, 5000);
    const scaled = rows.filter((_, k) => k % 2 === 0).map((db) => (db + 1.2) / (0.1 * Math.SQRT2));
    expect(kolmogorovTest(scaled, normalCdf).pValue).toBeGreaterThan(RARE);
    // Loss that is common to both guides of a mesh never costs fidelity.
    expect(rows.filter((_, k) => k % 2 === 1).every((fidelity) => fidelity > 1 - 1e-14)).toBe(true);
  });

  // Without a nominal loss half of the draws are at 0: the mean of max(0, normal) is s/sqrt(2 pi).
  it('never amplify', () => {
    const plan = planFor(2, { lossSigmaDb: 0.2 }, { figures: ['transmissionDb'] });
    const { rows } = runPlan(plan, 20_000);
    // Rounding of a whole transmission is some 1e-15 dB.
    expect(rows.every((db) => db < 1e-14)).toBe(true);
    const { mean, standardError } = sampleOf(rows);
    expect(Math.abs(mean + (2 * 0.2) / Math.sqrt(2 * Math.PI))).toBeLessThan(4 * standardError);
  });

  it('vary around measured losses of cells', () => {
    const base = planFor(3, { lossSigmaDb: 0.01 });
    const cellLoss = Float64Array.from([0.9, 0.8, 0.7]);
    const sampled = samples({ ...base, chip: { ...base.chip, cellLoss } }, 500);
    cellLoss.forEach((nominal, cell) => {
      const losses = sampled.map(({ chip }) => -20 * Math.log10(chip.cellLoss![cell]!));
      const { mean, deviation, standardError } = sampleOf(losses);
      expect(Math.abs(mean + 20 * Math.log10(nominal))).toBeLessThan(4 * standardError);
      // The standard error of a normal's standard deviation is sigma/sqrt(2 n).
      expect(Math.abs(deviation / (0.01 * Math.SQRT2) - 1)).toBeLessThan(4 / Math.sqrt(1000));
    });
  });
});

describe('a target of its own for each trial', () => {
  const trials = 2000;
  const modes = 4;
  const plan = planFor(modes, { sigma: 0.01 }, { target: 'haar' });
  const targets = samples(plan, trials).map(({ target }) => target);

  it('is another one each time, and the same for the same trial', () => {
    expect(new Set(targets.map(({ re }) => re[0])).size).toBe(trials);
    expect(maxDifference(createTrialEngine(plan).sample(17).target, targets[17]!)).toBe(0);
    expect(maxDifference(targets[0]!, haarUnitary(modes, plan.seed))).toBeGreaterThan(0.1);
  });

  // |U_ij|^2 is Beta(1, N - 1): mean 1/N, mean square 2/(N (N + 1)) (check-values, section 3).
  it('has entries distributed as those of Haar matrices', () => {
    for (let entry = 0; entry < modes ** 2; entry++) {
      const powers = Float64Array.from(targets, ({ re, im }) => re[entry]! ** 2 + im[entry]! ** 2);
      expect(kolmogorovTest(powers, (p) => 1 - (1 - p) ** (modes - 1)).pValue).toBeGreaterThan(RARE);
    }
    const first = sampleOf(targets.map(({ re, im }) => (re[5]! ** 2 + im[5]! ** 2) ** 2));
    expect(Math.abs(first.mean - 2 / (modes * (modes + 1)))).toBeLessThan(4 * first.standardError);
  });

  // E |Tr U|^2j = j! for j <= N: Diaconis and Shahshahani, J. Appl. Probab. 31A, 49 (1994), from memory; also
  // between neighbours, which are independent.
  it('has the moments of the trace, and is independent of the next', () => {
    const traces = targets.map(({ re, im }) => {
      const sum = (part: Float64Array): number => part[0]! + part[5]! + part[10]! + part[15]!;
      return sum(re) ** 2 + sum(im) ** 2;
    });
    const overlaps = targets.slice(1).map((target, k) => {
      const [re, im] = innerProduct(targets[k]!, target);
      return re ** 2 + im ** 2;
    });
    for (const values of [traces, overlaps]) {
      [1, 2, 6].forEach((expected, index) => {
        const { mean, standardError } = sampleOf(values.map((value) => value ** (index + 1)));
        expect(Math.abs(mean - expected)).toBeLessThan(4 * standardError);
      });
    }
  });
});

describe('trials in pieces', () => {
  const plans: [string, TrialPlan][] = [
    ['programmed once', planFor(6, { sigma: 0.3, phaseSigma: 0.02, biasSigma: 0.1 })],
    ['retuned', planFor(6, { sigma: 0.2, lossSigmaDb: 0.1 }, { retune: 'cell', target: 'haar' })],
    [
      'judged the long way',
      planFor(4, { sigma: 0.3, bits: 6 }, { retune: 'cell', figures: ['worstCaseError', 'powerDistance'] }),
    ],
    ['uniform', planFor(5, { sigma: 0.3, phaseSigma: 0.1, distribution: 'uniform' })],
  ];
  it.each(plans)('give the same rows as all at once, on one engine or several: %s', async (_, plan) => {
    const columns = plan.figures.length;
    const whole = runPlan(plan, 100);
    for (const pieces of [
      [30, 70],
      [1, 98, 1],
      [33, 34, 33],
    ]) {
      for (const shared of [createTrialEngine(plan), null]) {
        const rows = new Float64Array(100 * columns);
        let first = 0;
        let clamped = 0;
        for (const count of pieces) {
          const part = rows.subarray(first * columns, (first + count) * columns);
          clamped += (shared ?? createTrialEngine(plan)).run(first, count, part);
          first += count;
        }
        expect({ rows, clamped }).toEqual(whole);
      }
    }
    const progress: number[] = [];
    const results = await runTrials(plan, 100, { onProgress: (done) => progress.push(done) });
    expect(results).toEqual({ ...whole, outOfTime: 0 });
    expect(progress.at(-1)).toBe(100);
    expect(whole.clamped).toBeGreaterThan(0);
  });

  it('depend on the seed, all 53 bits of it', () => {
    const rowsOf = (seed: number): number[] =>
      Array.from(runPlan(planFor(3, { sigma: 0.02 }, { seed }), 2).rows);
    const seeds = [0, 1, 2 ** 32, 2 ** 53 - 1, 2 ** 53 - 2];
    expect(new Set(seeds.map((seed) => rowsOf(seed)[0])).size).toBe(seeds.length);
    expect(rowsOf(1)[0]).not.toBe(rowsOf(0)[1]);
  });

  it('stop when they are told to', async () => {
    const controller = new AbortController();
    controller.abort(new Error('enough'));
    const plan = planFor(3, { sigma: 0.02 });
    await expect(runTrials(plan, 10, { signal: controller.signal })).rejects.toThrow('enough');
  });
});

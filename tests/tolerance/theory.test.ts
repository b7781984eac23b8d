import { describe, expect, it } from 'vitest';
import type { ProcessErrors } from '../../src/chip/Chip.js';
import { decompose } from '../../src/decompose/decompose.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import { figuresOfMerit } from '../../src/merit/merit.js';
import { LAYOUTS } from '../../src/mesh/Mesh.js';
import { carryingSweep } from '../../src/program/carryingSweep.js';
import { simulate } from '../../src/simulate/simulate.js';
import { normalQuantile } from '../../src/statistics/normalDistribution.js';
import { infidelityTheory, portsTheory, toleranceTheory } from '../../src/tolerance/smallErrorTheory.js';
import type { TrialPlan } from '../../src/tolerance/TrialPlan.js';
import { dft } from '../support/matrices.js';
import { infidelities, planFor, runPlan } from './trialPlans.js';

/** The same plan with other nominal ratios. */
function withRatios(plan: TrialPlan, ratioOf: (splitter: number) => number): TrialPlan {
  const couplingRatios = plan.chip.couplingRatios.map((_, k) => ratioOf(k));
  return { ...plan, chip: { ...plan.chip, couplingRatios } };
}

/** 1 - F of the chip as it stands, programmed for its ratios. */
function withoutErrors({ chip, target }: TrialPlan): number {
  if (target === 'haar') return 0;
  const { settings } = carryingSweep(chip, decompose(target, chip.mesh));
  return 1 - figuresOfMerit(target, simulate(chip, settings)).fidelity;
}

describe('the mean infidelity of small errors', () => {
  it('is nothing to say when other sources act, when errors are correlated, or when nothing does', () => {
    const plan = (errors: Partial<ProcessErrors>): TrialPlan => planFor(4, errors);
    expect(infidelityTheory(plan({}), 0)).toBeNull();
    for (const source of ['sigma', 'sigmaAngle'] as const) {
      expect(infidelityTheory(plan({ [source]: 0.01 }), 0)).not.toBeNull();
      for (const other of [
        { bias: -0.01 },
        { biasSigma: 0.01 },
        { phaseSigma: 0.01 },
        { bits: 8 },
        { lossSigmaDb: 0.1 },
        { pairCorrelation: -0.1 },
        { correlationLength: 1 },
      ]) {
        expect(infidelityTheory(plan({ [source]: 0.01, ...other }), 0), JSON.stringify(other)).toBeNull();
      }
    }
    expect(infidelityTheory(planFor(1, { sigma: 0.01 }), 0)).toBeNull();
  });

  it('is nothing to say of retuned chips for one target, or with ratios other than 1/2', () => {
    const retuned = planFor(4, { sigma: 0.01 }, { retune: 'cell', target: 'haar' });
    expect(infidelityTheory(retuned, 0)).not.toBeNull();
    expect(infidelityTheory({ ...retuned, target: dft(4) }, 0)).toBeNull();
    expect(
      infidelityTheory(
        withRatios(retuned, (k) => (k === 3 ? 0.49 : 0.5)),
        0,
      ),
    ).toBeNull();
  });

  // At a ratio of 0 or 1 an error can only go one way.
  it.each([0, 1])('is nothing to say with a splitter of ratio %i', (ratio) => {
    for (const source of ['sigma', 'sigmaAngle']) {
      const plan = planFor(4, { [source]: 0.01 });
      expect(
        infidelityTheory(
          withRatios(plan, (k) => (k === 2 ? ratio : 0.5)),
          0,
        ),
      ).toBeNull();
    }
  });

  it('is L (1 - c L) with c of check-values section 2', () => {
    for (const [modes, triangular, rectangular] of [
      [2, 5 / 6, 5 / 6],
      [3, 0.65, 0.65],
      [4, 0.59, 0.58],
      [8, 0.549, 0.523],
      [16, 0.54, 0.507],
      [1024, 0.5, 0.5],
    ] as const) {
      for (const layout of LAYOUTS) {
        const plan = planFor(modes > 100 ? 64 : modes, { sigmaAngle: 0.01 }, { target: 'haar' }, { layout });
        const law = 2 * (plan.chip.mesh.modes - 1) * 1e-4;
        const c = (1 - infidelityTheory(plan, 0)!.meanInfidelity / law) / law;
        const expected = layout === 'triangular' ? triangular : rectangular;
        // Between 16 ports and infinitely many, c lies between.
        if (modes > 100) expect(c).toBeGreaterThan(0.5);
        expect(Math.abs(c - expected)).toBeLessThan(modes > 100 ? 0.012 : 1e-9);
      }
    }
  });

  // An error e of the ratio k is one of e/(2 sqrt(k (1 - k))) of the angle: 19 % more at 0.3 than at 1/2. The
  // Fourier transform's cells are in reach.
  it.each([
    [0.45, 'of the Fourier transform', dft(3), 0.02],
    [0.4, 'of a Haar matrix', haarUnitary(8, 4), 0.02],
    [0.3, 'of a Haar matrix', haarUnitary(8, 4), 0.005],
    [0.5, 'of a Haar matrix', haarUnitary(16, 4), 0.03],
  ] as const)('is that of trials with the nominal ratio %f, %s', (ratio, _, target, sigma) => {
    for (const layout of LAYOUTS) {
      const plan = withRatios(planFor(target.rows, { sigma }, { target }, { layout }), () => ratio);
      const theory = infidelityTheory(plan, withoutErrors(plan))!;
      const { mean, standardError } = infidelities(plan, 20_000);
      expect(Math.abs(mean - theory.meanInfidelity)).toBeLessThan(4 * standardError + theory.uncertainty);
    }
  });

  // asin(sqrt(1/2 + e)) = pi/4 + e + (2/3) e^3: mean square s^2 + (4/3) m s^4, m = 3 for normal and 9/5 for
  // uniform errors. The trials tell it from s^2.
  it.each(['normal', 'uniform'] as const)(
    'allows for the bent line from ratio to angle: %s errors',
    (distribution) => {
      const sigma = 0.05;
      const moment = distribution === 'normal' ? 3 : 9 / 5;
      const plan = planFor(4, { sigma, distribution }, { target: 'haar' });
      const theory = infidelityTheory(plan, 0)!;
      const law = 6 * sigma ** 2;
      const bent = (4 / 3) * moment * sigma ** 2 * law;
      expect(theory.meanInfidelity).toBeCloseTo(law - 0.58 * law ** 2 + bent, 12);
      const { mean, standardError } = infidelities(plan, 40_000);
      expect(Math.abs(mean - theory.meanInfidelity)).toBeLessThan(4 * standardError + theory.uncertainty);
      expect(bent).toBeGreaterThan(2 * standardError + theory.uncertainty);
    },
  );

  // Nominal ratios where the line is bent strongly: (k, s) for which L alone is 2 and 17 % too small.
  it.each([
    [0.1, 0.02],
    [0.05, 0.02],
  ])('is uncertain enough near the ends: ratio %f, sigma %f', (ratio, sigma) => {
    const base = withRatios(planFor(4, { sigma }), (k) => (k < 6 ? ratio : 0.5));
    // A target that the chip can do: what it does when it is set for another one.
    const { settings } = carryingSweep(base.chip, decompose(haarUnitary(4, 1), base.chip.mesh));
    const plan = { ...base, target: simulate(base.chip, settings) };
    expect(withoutErrors(plan)).toBeLessThan(1e-13);
    const theory = infidelityTheory(plan, 0)!;
    const { mean, standardError } = infidelities(plan, 20_000);
    expect(Math.abs(mean - theory.meanInfidelity)).toBeLessThan(4 * standardError + theory.uncertainty);
    expect(theory.uncertainty).toBeLessThan(0.2 * theory.meanInfidelity);
  });

  it('adds the variances of both kinds of errors', () => {
    const plan = planFor(8, { sigma: 0.01, sigmaAngle: 0.015 });
    const theory = infidelityTheory(plan, 0)!;
    expect(theory.meanInfidelity).toBeCloseTo(14 * (0.01 ** 2 + 0.015 ** 2), 4);
    const { mean, standardError } = infidelities(plan, 20_000);
    expect(Math.abs(mean - theory.meanInfidelity)).toBeLessThan(4 * standardError + theory.uncertainty);
  });

  it('is that of trials of retuned chips', () => {
    const plan = planFor(8, { sigma: 0.03 }, { retune: 'cell', target: 'haar' });
    const theory = infidelityTheory(plan, 0)!;
    const { mean, standardError } = infidelities(plan, 5000);
    expect(Math.abs(mean - theory.meanInfidelity)).toBeLessThan(4 * standardError + theory.uncertainty);
  });
});

describe('the closed-form tolerance', () => {
  const quantile = normalQuantile(0.9);

  // The estimate takes 1 - F as normal. With its relative scatter r it is nearer to chi-square, of skewness
  // about 2 r; the next term of Cornish and Fisher's series then moves the share by (2 r/6) (z^2 - 1)
  // density(z) < 0.02 for r up to 0.53.
  it.each([4, 8, 16])('is a spread at which the yield is about what is wanted: N = %i', (modes) => {
    const plan = planFor(modes, {}, { target: 'haar' });
    for (const source of ['sigma', 'sigmaAngle'] as const) {
      const value = toleranceTheory(plan, source, 0.99, quantile, 0)!;
      const trials = 64_000 / modes ** 2;
      const { rows } = runPlan({ ...plan, errors: { ...plan.errors, [source]: value } }, trials);
      const share = rows.filter((fidelity) => fidelity >= 0.99).length / trials;
      expect(Math.abs(share - 0.9)).toBeLessThan(0.02 + 4 * Math.sqrt(0.09 / trials));
    }
  });

  it('is null for other sources, retuned chips, one port, and limits that cannot be', () => {
    const plan = planFor(4, {});
    expect(toleranceTheory(plan, 'phaseSigma', 0.99, quantile, 0)).toBeNull();
    expect(toleranceTheory({ ...plan, retune: 'cell' }, 'sigma', 0.99, quantile, 0)).toBeNull();
    expect(toleranceTheory(planFor(1, {}), 'sigma', 0.99, quantile, 0)).toBeNull();
    expect(toleranceTheory(plan, 'sigma', 1, quantile, 0)).toBeNull();
    expect(toleranceTheory(plan, 'sigma', NaN, quantile, 0)).toBeNull();
    expect(toleranceTheory(planFor(4, { bits: 6 }), 'sigma', 0.99, quantile, 0)).toBeNull();
    expect(
      toleranceTheory(
        withRatios(plan, () => 1),
        'sigma',
        0.99,
        quantile,
        0,
      ),
    ).toBeNull();
    // A chip whose own flaws cost more than the limit allows, or differ from target to target.
    expect(toleranceTheory(plan, 'sigma', 0.99, quantile, 0.02)).toBeNull();
    expect(toleranceTheory(plan, 'sigma', 0.99, quantile, null)).toBeNull();
    const half = toleranceTheory(plan, 'sigma', 0.99, quantile, 0.005)!;
    expect(half).toBeCloseTo(toleranceTheory(plan, 'sigma', 0.995, quantile, 0)!, 12);
  });
});

describe('the number of ports that keep a fidelity', () => {
  const z = normalQuantile(0.9);
  const ports = (errors: Partial<ProcessErrors>, limit = 0.99, modes = 8): number | null =>
    portsTheory(planFor(modes, errors), limit, z, 0);

  it('is that at which the spread that they stand is the spread that they have', () => {
    // The other law asked the other way round: chips of so many ports stand this sigma.
    for (const sigma of [0.005, 0.01, 0.02]) {
      const found = ports({ sigma })!;
      const [below, above] = [Math.floor(found), Math.ceil(found)].map((modes) =>
        toleranceTheory(planFor(modes, { sigma }), 'sigma', 0.99, z, 0)!,
      );
      expect([below! >= sigma, above! <= sigma]).toEqual([true, true]);
    }
    // It does not matter with how many ports the plan comes.
    expect(ports({ sigmaAngle: 0.01 }, 0.99, 3)).toBeCloseTo(ports({ sigmaAngle: 0.01 })!, 9);
  });

  it('is nothing to say of other errors, flawed chips, retuned ones, or where not even two ports do', () => {
    expect(ports({ phaseSigma: 0.01 })).toBeNull();
    expect(ports({ sigma: 0.01, bits: 8 })).toBeNull();
    expect(ports({ sigma: 0.2 })).toBeNull();
    const plan = planFor(8, { sigma: 0.01 });
    expect(portsTheory(plan, 0.99, z, 1e-4)).toBeNull();
    expect(portsTheory(plan, 0.99, z, null)).toBeNull();
    expect(portsTheory({ ...plan, retune: 'cell' }, 0.99, z, 0)).toBeNull();
    const unlike = withRatios(plan, (k) => (k === 2 ? 0.49 : 0.5));
    expect(portsTheory(unlike, 0.99, z, 0)).toBeNull();
  });
});

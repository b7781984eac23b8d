import { describe, expect, it } from 'vitest';
import type { CellStyle } from '../../src/chip/Chip.js';
import { REFERENCE_STYLE } from '../../src/chip/idealChip.js';
import type { ComplexMatrix } from '../../src/matrix/ComplexMatrix.js';
import { identityMatrix } from '../../src/matrix/ComplexMatrix.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import type { Layout } from '../../src/mesh/Mesh.js';
import { LAYOUTS } from '../../src/mesh/Mesh.js';
import { infidelityTheory, portsTheory, toleranceTheory } from '../../src/tolerance/smallErrorTheory.js';
import type { TrialPlan } from '../../src/tolerance/TrialPlan.js';
import { dft, reversal } from '../support/matrices.js';
import type { Sample } from './trialPlans.js';
import { infidelities, planFor, runPlan, sampleOf } from './trialPlans.js';

// Cells with a third splitter before (or behind) the external phase: Hamerly, Bandyopadhyay, Englund, Nat.
// Commun. 13, 6831 (2022). The laws are derived and checked against an independent NumPy program
// (check-values, section 2).

const STYLE: CellStyle = { ...REFERENCE_STYLE, splitters: 3 };

function haarPlan(modes: number, sigmaAngle: number, layout: Layout, style = STYLE): TrialPlan {
  return planFor(modes, { sigmaAngle }, { target: 'haar', retune: 'cell' }, { layout, style });
}

/**
 * Sum over all cells of k 2^(1-k), the density of the bar power, Beta(1, k), at one half: where what is out of
 * reach lies, a disc of area pi e^2 in the amplitude for an angle e missed. It tends to 4 N.
 */
function densityAtHalf(modes: number): number {
  let sum = 0;
  for (let k = 1; k < modes; k++) sum += (modes - k) * k * 2 ** (1 - k);
  return sum;
}

/** A chip with all cells in reach is exact to rounding. */
function exactShare(plan: TrialPlan, trials: number): { share: number; standardError: number } {
  const share = runPlan(plan, trials).rows.filter((fidelity) => fidelity > 1 - 1e-11).length / trials;
  return { share, standardError: Math.sqrt((share * (1 - share)) / trials) };
}

describe('the share of Haar targets that cells of three splitters do exactly', () => {
  // E[(alpha + beta)^2] + E[(alpha - beta)^2] = 4 s^2, so exp(-4 s^2 sum) to leading order.
  it.each([
    [8, 0.03, 4000],
    [16, 0.03, 3000],
    [32, 0.02, 600],
  ])('is that of small forbidden discs: N = %i, sigma %f', (modes, sigma, trials) => {
    const expected = Math.exp(-4 * sigma ** 2 * densityAtHalf(modes));
    for (const layout of LAYOUTS) {
      const { share, standardError } = exactShare(haarPlan(modes, sigma, layout), trials);
      expect(Math.abs(share - expected), layout).toBeLessThan(4 * standardError);
    }
  });

  // The published form, exp(-16 N s^2) for N >> 1: it leaves out 48 s^2 in the exponent.
  it('tends to exp(-16 N s^2)', () => {
    const [modes, sigma] = [64, 0.02];
    const published = Math.exp(-16 * modes * sigma ** 2);
    const { share, standardError } = exactShare(haarPlan(modes, sigma, 'rectangular'), 400);
    expect(Math.abs(share / published - 1)).toBeLessThan(48 * sigma ** 2 + (4 * standardError) / published);
  });
});

describe('the error that retuning leaves with three splitters', () => {
  const law = (modes: number, sigma: number): number => ((8 * sigma ** 4) / modes) * densityAtHalf(modes);

  // Heavy-tailed: the mean is known to 4 or 5 %.
  it.each([
    [8, 20_000],
    [16, 8000],
  ])('is 8 s^4/N sum over k of (N - k) k 2^(1 - k): N = %i', (modes, trials) => {
    const behind: CellStyle = { ...STYLE, external: 'lower-output', splitterForm: 'real' };
    for (const [layout, style] of [
      ['rectangular', STYLE],
      ['triangular', behind],
    ] as const) {
      const { mean, standardError } = infidelities(haarPlan(modes, 0.03, layout, style), trials);
      expect(Math.abs(mean - law(modes, 0.03)), layout).toBeLessThan(3 * standardError);
      expect(standardError).toBeLessThan(0.06 * mean);
    }
  });

  // check-values, section 2: root mean square errors of N = 32 at sigma 0.03, to the digits given.
  it('does not grow with the mesh as that of two splitters does: N = 32', () => {
    const rms = (plan: TrialPlan, trials: number): Sample & { readonly root: number } => {
      const sample = infidelities(plan, trials);
      return { ...sample, root: Math.sqrt(sample.mean) };
    };
    const two = rms(haarPlan(32, 0.03, 'rectangular', REFERENCE_STYLE), 1000);
    const three = rms(haarPlan(32, 0.03, 'rectangular'), 1500);
    // The standard error of a root is half as large relatively.
    const within = ({ mean, standardError }: Sample): number => (2 * standardError) / mean;
    expect(Math.abs(two.root / 2.3e-2 - 1)).toBeLessThan(0.03 + within(two));
    expect(Math.abs(three.root / 5.1e-3 - 1)).toBeLessThan(0.03 + within(three));
    expect(three.root).toBeLessThan(4 * Math.SQRT2 * 0.03 ** 2 * (1 + within(three)));
  });

  // All splitters 45:55, N = 8 and 16: the cross state is in reach, so a reversal and an identity are exact.
  it('is none for crossing and straight light with all splitters 45:55', () => {
    for (const modes of [8, 16]) {
      for (const target of [reversal(modes), identityMatrix(modes)]) {
        const errors = { bias: -0.05 };
        const plan = planFor(modes, errors, { target, retune: 'cell' }, { style: STYLE });
        expect(runPlan(plan, 2).rows[0]).toBeGreaterThan(1 - 1e-13);
      }
      const plain = planFor(modes, { bias: -0.05 }, { target: reversal(modes), retune: 'cell' });
      expect(runPlan(plain, 2).rows[0]).toBeLessThan(0.95);
    }
  });
});

describe('the theory of small errors with three splitters', () => {
  // V = U prod exp(i e_k H_k), Tr H_k = 0, Tr H_k^2 = 2: (2/N) times the sum of all variances, for any target.
  it.each<[string, ComplexMatrix]>([
    ['Haar', haarUnitary(8, 3)],
    ['Fourier', dft(8)],
    ['identity', identityMatrix(8)],
  ])('is 3 (N - 1) s^2 without retuning: %s', (_, target) => {
    const sigma = 0.01;
    const law = 3 * 7 * sigma ** 2;
    for (const layout of LAYOUTS) {
      for (const source of ['sigma', 'sigmaAngle'] as const) {
        const plan = planFor(8, { [source]: sigma }, { target }, { layout, style: STYLE });
        const { mean, standardError } = infidelities(plan, 10_000);
        expect(Math.abs(mean - law)).toBeLessThan(4 * standardError + law ** 2);
      }
    }
  });

  it('is that of trials, retuned and not', () => {
    for (const retune of ['none', 'cell'] as const) {
      for (const modes of [4, 8]) {
        const plan = planFor(modes, { sigma: 0.03 }, { target: 'haar', retune }, { style: STYLE });
        const theory = infidelityTheory(plan, 0)!;
        const { mean, standardError } = infidelities(plan, 8000);
        const difference = Math.abs(mean - theory.meanInfidelity);
        expect(difference).toBeLessThan(4 * standardError + theory.uncertainty);
        expect(theory.holds).toBe(true);
      }
    }
  });

  it('has nothing to say of the tolerance, for want of the scatter', () => {
    const plan = planFor(8, { sigma: 0.01 }, { target: 'haar' }, { style: STYLE });
    expect(toleranceTheory(plan, 'sigma', 0.99, 1.28, 0)).toBeNull();
    expect(portsTheory(plan, 0.99, 1.28, 0)).toBeNull();
  });
});

it('three splitters of 0.1 dB lose 0.3 dB', () => {
  for (const lossSigmaDb of [0, 1e-9]) {
    const errors = { sigma: 0.01, lossSigmaDb };
    const plan = planFor(2, errors, { figures: ['transmissionDb'] }, { style: STYLE });
    const chip = { ...plan.chip, loss: { ...plan.chip.loss, splitter: 10 ** (-0.1 / 20) } };
    expect(sampleOf(runPlan({ ...plan, chip }, 4).rows).mean).toBeCloseTo(-0.3, 7);
  }
});

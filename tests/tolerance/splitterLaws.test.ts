import { describe, expect, it } from 'vitest';
import { REFERENCE_STYLE } from '../../src/chip/idealChip.js';
import type { ComplexMatrix } from '../../src/matrix/ComplexMatrix.js';
import { identityMatrix } from '../../src/matrix/ComplexMatrix.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import type { Layout } from '../../src/mesh/Mesh.js';
import { LAYOUTS } from '../../src/mesh/Mesh.js';
import { dft, reversal } from '../support/matrices.js';
import { infidelities, planFor, runPlan, sampleOf } from './trialPlans.js';

// The laws of small splitter errors. Unless something else is said they are derived and checked against an
// independent NumPy program (check-values, section 2). Every comparison allows 4 standard errors of the
// trials, and what the law leaves out.

/** L = 2 (N - 1) s^2. */
const leading = (modes: number, sigma: number): number => 2 * (modes - 1) * sigma ** 2;

describe.each(LAYOUTS)('mean infidelity on the %s mesh', (layout) => {
  const targets: [string, ComplexMatrix][] = [
    ['Haar', haarUnitary(8, 3)],
    ['Fourier', dft(8)],
    ['identity', identityMatrix(8)],
    ['reversal', reversal(8)],
  ];

  // V = U prod exp(i e_k H_k) with Tr H_k = 0, Tr H_k^2 = 2: holds for every target and every distribution of
  // variance s^2.
  it.each(targets)('is 2 (N - 1) s^2 for any target: %s', (_, target) => {
    const law = leading(8, 0.01);
    for (const distribution of ['normal', 'uniform'] as const) {
      for (const source of ['sigma', 'sigmaAngle'] as const) {
        const plan = planFor(8, { [source]: 0.01, distribution }, { target }, { layout });
        const { mean, standardError } = infidelities(plan, 10_000);
        expect(Math.abs(mean - law), `${source}, ${distribution}`).toBeLessThan(4 * standardError + law ** 2);
      }
    }
  });

  // E[1-F]/L at s = 0.05 from exact superoperator averages over Haar targets, rounded to three digits.
  const ratios: Record<Layout, [number, number][]> = {
    triangular: [
      [4, 0.991],
      [8, 0.981],
      [16, 0.961],
    ],
    rectangular: [
      [4, 0.991],
      [8, 0.982],
      [16, 0.963],
    ],
  };
  it.each(ratios[layout])('falls below the leading order as it must: N = %i, ratio %f', (modes, ratio) => {
    const plan = planFor(modes, { sigmaAngle: 0.05 }, { target: 'haar' }, { layout });
    const { mean, standardError } = infidelities(plan, 400_000 / modes ** 2);
    const law = leading(modes, 0.05);
    expect(Math.abs(mean / law - ratio)).toBeLessThan(4 * (standardError / law) + 0.0005);
    // So many trials tell the next order from none, for the larger meshes.
    if (modes >= 8) expect((1 - mean / law) / (standardError / law)).toBeGreaterThan(4);
  });

  // Relative scatter of 1 - F from chip to chip. The standard error of a standard deviation is about its size
  // times sqrt((kurtosis - 1)/4n); the distributions look like chi-square with 2/0.53^2 = 7 and more degrees
  // of freedom, kurtosis below 5.
  it.each([
    [4, 0.53, 0.005],
    [8, 0.28, 0.005],
    [16, 0.145, 0.006],
  ])('scatters from chip to chip: N = %i by %f', (modes, scatter, rounding) => {
    const trials = 160_000 / modes ** 2;
    const plan = planFor(modes, { sigmaAngle: 0.01 }, { target: 'haar', seed: 5 }, { layout });
    const { mean, deviation } = infidelities(plan, trials);
    expect(Math.abs(deviation / mean - scatter)).toBeLessThan(4 * (scatter / Math.sqrt(trials)) + rounding);
  });

  // Both splitters of a cell with the same error: 2 (N - 1) s^2 (1 + <cos theta>), theta Haar distributed,
  // which is 1 - 2/(k + 1) for N - k of the cells: Russell et al., New J. Phys. 19, 033007 (2017). With
  // opposite errors the other sign. cos theta is 1 - 2 |W11|^2 for symmetric splitters; the same power counts
  // for real ones. Factors of the NumPy program: 1.19, 1.39, 1.57.
  it.each([
    [4, 1.194],
    [8, 1.396],
    [16, 1.575],
  ])('with equal errors in each cell is larger: N = %i, factor %f', (modes, factor) => {
    const cellsOf = Array.from({ length: modes - 1 }, (_, index) => index + 1);
    const sum = cellsOf.reduce((total, k) => total + ((modes - k) * (k - 1)) / (k + 1), 0);
    const exact = 1 + sum / ((modes * (modes - 1)) / 2);
    expect(exact).toBeCloseTo(factor, 3);
    const law = leading(modes, 0.01);
    for (const [splitterForm, pairCorrelation] of [
      ['symmetric', 1],
      ['symmetric', -1],
      ['real', 1],
    ] as const) {
      const style = { ...REFERENCE_STYLE, splitterForm };
      const others = { target: 'haar' } as const;
      const plan = planFor(modes, { sigmaAngle: 0.01, pairCorrelation }, others, { layout, style });
      const { mean, standardError } = infidelities(plan, 96_000 / modes ** 2);
      const expected = 1 + pairCorrelation * (exact - 1);
      expect(Math.abs(mean / law - expected)).toBeLessThan(4 * (standardError / law) + 2 * law);
    }
  });

  // Hamerly, Bandyopadhyay, Englund, Phys. Rev. Applied 18, 024019 (2022) (from memory); values at s = 0.02
  // of the NumPy program, 1 %.
  it.each([
    [4, 0.049],
    [8, 0.0748],
    [16, 0.1094],
  ])('rms matrix error is sqrt(2 (N - 1)) s: N = %i, %f', (modes, published) => {
    const plan = planFor(modes, { sigmaAngle: 0.02 }, { figures: ['rmsError', 'fidelity'] }, { layout });
    const { rows } = runPlan(plan, 10_000);
    const errors = rows.filter((_, k) => k % 2 === 0);
    // Without loss norm_F(U - e^{ig} V)^2/N = 2 (1 - sqrt F).
    errors.forEach((error, k) => {
      expect(error ** 2).toBeCloseTo(2 * (1 - Math.sqrt(rows[2 * k + 1]!)), 13);
    });
    const { mean, standardError } = sampleOf(errors.map((error) => error ** 2));
    const law = leading(modes, 0.02);
    expect(Math.abs(mean - law)).toBeLessThan(4 * standardError + law ** 2);
    expect(Math.abs(Math.sqrt(mean) / published - 1)).toBeLessThan(0.01);
  });
});

describe('exact values', () => {
  // Means over Gaussian angle errors, s = 0.02 and 0.05 (check-values, section 5).
  it.each([
    [2, 0.02, 7.9952021e-4],
    [2, 0.05, 4.98130197e-3],
    [3, 0.02, 1.5984012e-3],
    [3, 0.05, 9.93778025e-3],
  ])('Fourier transform of %i ports, s = %f: %f', (modes, sigmaAngle, expected) => {
    const plan = planFor(modes, { sigmaAngle }, { target: dft(modes) });
    const { mean, standardError } = infidelities(plan, 300_000);
    expect(Math.abs(mean - expected)).toBeLessThan(4 * standardError);
    expect(standardError).toBeLessThan(0.002 * expected);
  });

  // F = cos^4 for a balanced cell with both errors equal, or opposite; its Gaussian mean is 3/8 + exp(-2
  // s^2)/2 + exp(-8 s^2)/8.
  it.each([1, -1])('balanced cell with errors of correlation %i', (pairCorrelation) => {
    const plan = planFor(2, { sigmaAngle: 0.1, pairCorrelation }, { target: dft(2) });
    const expected = 5 / 8 - Math.exp(-2 * 0.01) / 2 - Math.exp(-8 * 0.01) / 8;
    const { mean, standardError } = infidelities(plan, 200_000);
    expect(Math.abs(mean - expected)).toBeLessThan(4 * standardError);
  });

  // Two ports, Haar targets: E[F] = C^2 + (1 - C)^2/3, C = (1 + exp(-2 s^2))/2; 0.9803294 at s = 0.1.
  it.each(LAYOUTS)('two ports, Haar targets, %s', (layout) => {
    const c = (1 + Math.exp(-2 * 0.01)) / 2;
    const expected = 1 - (c ** 2 + (1 - c) ** 2 / 3);
    expect(1 - expected).toBeCloseTo(0.9803294, 7);
    const plan = planFor(2, { sigmaAngle: 0.1 }, { target: 'haar' }, { layout });
    const { mean, standardError } = infidelities(plan, 60_000);
    expect(Math.abs(mean - expected)).toBeLessThan(4 * standardError);
  });

  // Every ratio shifted to the angle pi/4 + 0.05: F of check-values, section 5, to all its digits.
  it.each([
    [2, 0.9950104049],
    [3, 0.9901756563],
  ])('all splitters of the Fourier transform of %i ports turned by 0.05: %f', (modes, expected) => {
    const plan = planFor(modes, { bias: Math.sin(0.1) / 2 }, { target: dft(modes) });
    const { rows } = runPlan(plan, 3);
    rows.forEach((fidelity) => expect(fidelity).toBeCloseTo(expected, 9));
  });
});

describe('both layouts', () => {
  // Flamini et al., Sci. Rep. 7, 15133 (2017), figure 3: fidelity against noise is the same in either layout,
  // since the number of noisy elements is.
  it.each([0.01, 0.03])('have the same mean fidelity under noise, sigma = %f', (sigma) => {
    const [a, b] = LAYOUTS.map((layout) =>
      infidelities(planFor(10, { sigma, phaseSigma: sigma }, {}, { layout }), 20_000),
    );
    const standardError = Math.hypot(a!.standardError, b!.standardError);
    const law = (2 * 9 + 9) * sigma ** 2;
    // The next orders differ by about 0.03 L^2.
    expect(Math.abs(a!.mean - b!.mean)).toBeLessThan(4 * standardError + 0.05 * law ** 2);
    expect(standardError).toBeLessThan(0.003 * law);
  });
});

describe('sigma', () => {
  // A ratio k = sin^2(pi/4 + x) = 1/2 + sin(2x)/2: an error of 0.02 in one is one of 0.02 in the other, up to
  // a relative s^2.
  it('counts as sigmaAngle for balanced splitters', () => {
    const [ratio, angle] = (['sigma', 'sigmaAngle'] as const).map((source) =>
      infidelities(planFor(8, { [source]: 0.02 }), 40_000),
    );
    const standardError = Math.hypot(ratio!.standardError, angle!.standardError);
    expect(Math.abs(ratio!.mean - angle!.mean)).toBeLessThan(4 * standardError + 4 * 0.02 ** 2 * angle!.mean);
  });
});

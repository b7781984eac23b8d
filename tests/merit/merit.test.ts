import { describe, expect, it } from 'vitest';
import type { ComplexMatrix } from '../../src/matrix/ComplexMatrix.js';
import { identityMatrix, matrixFromRows, zeroMatrix } from '../../src/matrix/ComplexMatrix.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import { multiply, turnPhase } from '../../src/matrix/products.js';
import { singularValues } from '../../src/matrix/singularValues.js';
import { figuresOfMerit, isUpperLimit, MERIT_KEYS } from '../../src/merit/merit.js';
import { missingPortPhases } from '../../src/merit/portPhaseFree.js';
import { randomStream } from '../../src/random/RandomStream.js';
import { reversal } from '../support/matrices.js';

function diagonal(
  phases: readonly number[],
  amplitudes: readonly number[] = phases.map(() => 1),
): ComplexMatrix {
  return matrixFromRows(
    phases.map((phase, i) =>
      phases.map((_, j) =>
        i === j ? ([amplitudes[i]! * Math.cos(phase), amplitudes[i]! * Math.sin(phase)] as const) : 0,
      ),
    ),
  );
}

const target = haarUnitary(4, 1);
const unitary = haarUnitary(4, 2);
const lossy = multiply(
  diagonal([0, 0.2, -0.1, 0.3], [1, 0.7, 0.9, 0.6]),
  multiply(unitary, diagonal([0, 0, 0, 0], [0.9, 1, 0.5, 0.8])),
);

describe('a perfect chip', () => {
  it('has fidelity 1 and no error, whatever the global phase and uniform loss', () => {
    const merit = figuresOfMerit(target, turnPhase(target, 2.2));
    for (const key of ['fidelity', 'averageGateFidelity', 'portPhaseFreeFidelity', 'transmission'] as const) {
      expect(merit[key]).toBeCloseTo(1, 14);
    }
    for (const key of ['rmsError', 'worstCaseError', 'powerDistance'] as const) {
      expect(merit[key]).toBeLessThan(1e-14);
    }
    const half = figuresOfMerit(target, {
      ...target,
      re: target.re.map((x) => x / 2),
      im: target.im.map((x) => x / 2),
    });
    expect(half.fidelity).toBeCloseTo(1, 14);
    expect(half.powerDistance).toBeLessThan(1e-14);
    expect(half.transmission).toBeCloseTo(0.25, 14);
    expect(half.transmissionDb).toBeCloseTo(-6.020599913279624, 12);
  });
});

describe('fidelities', () => {
  // check-values section 7, derived and checked there: average over Haar states of overlap, over mean
  // transmission for lossy V.
  it.each([
    ['unitary', unitary],
    ['lossy', lossy],
  ])('average gate fidelity is the mean over random states, %s', (_name, achieved) => {
    const random = randomStream(7, 902);
    const samples = 40_000;
    let [overlap, overlapSquare, transmission] = [0, 0, 0];
    for (let k = 0; k < samples; k++) {
      const state = Array.from({ length: 4 }, () => [random.normal(), random.normal()] as const);
      const norm = Math.sqrt(state.reduce((sum, [x, y]) => sum + x * x + y * y, 0));
      const column = matrixFromRows(state.map(([x, y]) => [[x / norm, y / norm] as const]));
      const [wanted, found] = [multiply(target, column), multiply(achieved, column)];
      let [re, im] = [0, 0];
      for (let i = 0; i < 4; i++) {
        re += wanted.re[i]! * found.re[i]! + wanted.im[i]! * found.im[i]!;
        im += wanted.re[i]! * found.im[i]! - wanted.im[i]! * found.re[i]!;
        transmission += found.re[i]! ** 2 + found.im[i]! ** 2;
      }
      overlap += re * re + im * im;
      overlapSquare += (re * re + im * im) ** 2;
    }
    const merit = figuresOfMerit(target, achieved);
    const mean = overlap / samples;
    const error = Math.sqrt((overlapSquare / samples - mean ** 2) / samples);
    expect(merit.transmission).toBeCloseTo(transmission / samples, 2);
    expect(Math.abs(mean - merit.averageGateFidelity * merit.transmission)).toBeLessThan(4 * error);
  });

  it('port-phase-free fidelity is blind to the phases of its ports and at least the fidelity', () => {
    const phases = [0.4, 2, -1, 3];
    for (const achieved of [unitary, lossy]) {
      const output = figuresOfMerit(target, achieved, 'output').portPhaseFreeFidelity;
      const input = figuresOfMerit(target, achieved, 'input').portPhaseFreeFidelity;
      const turnedOut = multiply(diagonal(phases), achieved);
      const turnedIn = multiply(achieved, diagonal(phases));
      expect(figuresOfMerit(target, turnedOut, 'output').portPhaseFreeFidelity).toBeCloseTo(output, 13);
      expect(figuresOfMerit(target, turnedIn, 'input').portPhaseFreeFidelity).toBeCloseTo(input, 13);
      expect(output).toBeGreaterThanOrEqual(figuresOfMerit(target, achieved).fidelity);
      expect(input).not.toBeCloseTo(output, 3);
    }
  });

  it('is attained by the missing port phases, and exceeded by no others', () => {
    const random = randomStream(8, 902);
    for (const side of ['output', 'input'] as const) {
      const place = (phases: ArrayLike<number>): ComplexMatrix => {
        const port = diagonal(Array.from(phases));
        return side === 'output' ? multiply(port, unitary) : multiply(unitary, port);
      };
      const best = figuresOfMerit(target, unitary, side).portPhaseFreeFidelity;
      const phases = missingPortPhases(target, unitary, side);
      expect(figuresOfMerit(target, place(phases)).fidelity).toBeCloseTo(best, 13);
      for (let k = 0; k < 200; k++) {
        const other = Array.from({ length: 4 }, () => 7 * random.uniform());
        expect(figuresOfMerit(target, place(other)).fidelity).toBeLessThanOrEqual(best + 1e-14);
      }
    }
  });
});

describe('errors', () => {
  // check-values section 7: min over a global phase of norm_F(U-V)^2/N is 2(1 - sqrt F) for unitary V.
  it('rms error of a unitary follows from the fidelity', () => {
    const { rmsError, fidelity } = figuresOfMerit(target, unitary);
    expect(rmsError).toBeCloseTo(Math.sqrt(2 * (1 - Math.sqrt(fidelity))), 13);
  });

  it('rms error is the least over the global phase, also with loss', () => {
    const { rmsError } = figuresOfMerit(target, lossy);
    const at = (g: number): number => {
      const turned = turnPhase(lossy, g);
      let sum = 0;
      for (let k = 0; k < 16; k++)
        sum += (target.re[k]! - turned.re[k]!) ** 2 + (target.im[k]! - turned.im[k]!) ** 2;
      return Math.sqrt(sum / 4);
    };
    const sampled = Array.from({ length: 2000 }, (_, k) => at((k / 2000) * 2 * Math.PI));
    expect(Math.min(...sampled)).toBeGreaterThanOrEqual(rmsError - 1e-14);
    expect(Math.min(...sampled)).toBeCloseTo(rmsError, 5);
  });

  // check-values section 7: norm_op(U - V) = max |e^{i lambda} - 1|; norm_F/sqrt(N) <= norm_op <= norm_F.
  it('worst-case error of a diagonal of phases is that of its worst phase', () => {
    const lambda = [0.3, -0.3, 0.1, -0.1];
    const merit = figuresOfMerit(identityMatrix(4), diagonal(lambda));
    expect(merit.worstCaseError).toBeCloseTo(2 * Math.sin(0.15), 14);
    expect(merit.rmsError).toBeLessThanOrEqual(merit.worstCaseError);
    expect(merit.worstCaseError).toBeLessThanOrEqual(2 * merit.rmsError);
  });

  it('worst-case error is the largest singular value of the error at the best global phase', () => {
    const merit = figuresOfMerit(target, lossy);
    let best = Infinity;
    let phase = 0;
    for (let k = 0; k < 20_000; k++) {
      const g = (k / 20_000) * 2 * Math.PI;
      let real = 0;
      for (let e = 0; e < 16; e++) {
        const [ur, ui, vr, vi] = [target.re[e]!, target.im[e]!, lossy.re[e]!, lossy.im[e]!];
        real += Math.cos(g) * (ur * vr + ui * vi) - Math.sin(g) * (ur * vi - ui * vr);
      }
      if (-real < best) [best, phase] = [-real, g];
    }
    const turned = turnPhase(lossy, phase);
    const error = {
      ...target,
      re: target.re.map((x, k) => x - turned.re[k]!),
      im: target.im.map((x, k) => x - turned.im[k]!),
    };
    // The phase is found on a grid of 3e-4, the norm is flat to first order only in Frobenius: hence 1e-3.
    expect(Math.abs(singularValues(error)[0]! - merit.worstCaseError)).toBeLessThan(1e-3);
  });

  it('power distance is the total variation per input, normalised, averaged', () => {
    const achieved = matrixFromRows([
      [0.6, 0],
      [0.3, [0, 0.5]],
    ]);
    // Input 1: powers 0.8, 0.2 against 1, 0: distance 0.2. Input 2: all at output 2: distance 0.
    expect(figuresOfMerit(identityMatrix(2), achieved).powerDistance).toBeCloseTo(0.1, 14);
    expect(figuresOfMerit(identityMatrix(3), reversal(3)).powerDistance).toBeCloseTo(2 / 3, 14);
    const phases = multiply(diagonal([1, 2, 3, 4]), multiply(target, diagonal([4, 3, 2, 1])));
    expect(figuresOfMerit(target, phases).powerDistance).toBeLessThan(1e-15);
  });

  it('takes g = 0 where the trace vanishes', () => {
    const merit = figuresOfMerit(
      identityMatrix(2),
      matrixFromRows([
        [0, 1],
        [1, 0],
      ]),
    );
    expect(merit.fidelity).toBe(0);
    expect(merit.averageGateFidelity).toBeCloseTo(1 / 3, 15);
    // Eigenvalues of I - X: 0 and 2.
    expect(merit.worstCaseError).toBeCloseTo(2, 14);
    expect(merit.rmsError).toBeCloseTo(Math.SQRT2, 14);
  });
});

it('a dark chip has fidelity 0 and loses everything', () => {
  const merit = figuresOfMerit(target, zeroMatrix(4, 4));
  expect(merit).toMatchObject({
    fidelity: 0,
    portPhaseFreeFidelity: 0,
    powerDistance: 1,
    transmission: 0,
    transmissionDb: -Infinity,
  });
});

it('knows which figures are errors', () => {
  expect(MERIT_KEYS.filter(isUpperLimit)).toEqual(['rmsError', 'worstCaseError', 'powerDistance']);
});

it('refuses matrices of different sizes', () => {
  expect(() => figuresOfMerit(identityMatrix(2), identityMatrix(3))).toThrow(RangeError);
});

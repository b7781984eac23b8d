import { describe, expect, it } from 'vitest';
import { createCurvatureMemory } from '../../src/optimise/CurvatureMemory.js';
import type { Evaluated } from '../../src/optimise/Problem.js';
import type { LinePoint } from '../../src/optimise/searchLine.js';
import { searchLine } from '../../src/optimise/searchLine.js';
import { randomStream } from '../../src/random/RandomStream.js';

function normals(size: number, seed: number): Float64Array {
  const random = randomStream(seed, 911);
  return Float64Array.from({ length: size }, () => random.normal());
}

/** Two points that lie a step apart, with gradients that differ by the change. */
function between(step: Float64Array, change: Float64Array): [from: Evaluated, to: Evaluated] {
  const from = { point: step.map(Math.sin), gradient: change.map(Math.cos), cost: 0 };
  const to = {
    point: from.point.map((value, k) => value + step[k]!),
    gradient: from.gradient.map((value, k) => value + change[k]!),
    cost: 0,
  };
  return [from, to];
}

/** Steps with the changes of the gradient that a fixed diagonal Hessian gives. */
function remembered(size: number, pairs: number): ReturnType<typeof createCurvatureMemory> {
  const memory = createCurvatureMemory(5);
  for (let k = 0; k < pairs; k++) {
    const step = normals(size, k);
    memory.remember(
      ...between(
        step,
        step.map((value, index) => value * (1 + index)),
      ),
    );
  }
  return memory;
}

describe('the memory of curvature', () => {
  // What defines a quasi-Newton method: H y = s for the last pair; in a subspace, for the parts that lie in it.
  it('meets the secant equation, in the subspace of free variables too', () => {
    for (const size of [1, 2, 5, 8, 13]) {
      for (const pairs of [1, 2, 5, 9]) {
        for (const held of [[], [0], [2, 4, 7]].filter((indices) => indices.every((k) => k < size - 1))) {
          const memory = remembered(size, pairs);
          const step = normals(size, pairs - 1);
          const vector = step.map((value, index) => (held.includes(index) ? 0 : value * (1 + index)));
          memory.multiplyInPlace(vector, held);
          vector.forEach((value, k) => expect(value).toBeCloseTo(held.includes(k) ? 0 : step[k]!, 10));
        }
      }
    }
  });

  it('is symmetric and positive definite, and forgets', () => {
    const memory = remembered(9, 7);
    expect(memory.size).toBe(5);
    const held = [3];
    const [a, b] = [20, 21].map((seed) => normals(9, seed).map((value, k) => (k === 3 ? 0 : value)));
    const product = (x: Float64Array, y: Float64Array): number =>
      x.reduce((sum, value, k) => sum + value * y[k]!, 0);
    const times = (x: Float64Array): Float64Array => {
      const result = x.slice();
      memory.multiplyInPlace(result, held);
      return result;
    };
    expect(product(a!, times(b!))).toBeCloseTo(product(b!, times(a!)), 11);
    for (let seed = 30; seed < 50; seed++) {
      const x = normals(9, seed).map((value, k) => (k === 3 ? 0 : value));
      expect(product(x, times(x))).toBeGreaterThan(0);
    }
    memory.forget();
    expect(times(a!)).toEqual(a);
  });

  it('passes over pairs without positive curvature', () => {
    const memory = createCurvatureMemory(3);
    memory.remember(...between(Float64Array.of(1, 2), Float64Array.of(-1, -1)));
    const vector = Float64Array.of(3, 4);
    memory.multiplyInPlace(vector, []);
    expect(vector).toEqual(Float64Array.of(3, 4));
  });
});

describe('the search along a line', () => {
  /** Runs a search on a function of one variable and its derivative. */
  function search(
    cost: (x: number) => number,
    slope: (x: number) => number,
    firstStep: number,
  ): { readonly start: LinePoint; readonly found: LinePoint | null; readonly evaluations: number } {
    const none = new Float64Array(0);
    const at = (step: number): LinePoint => ({
      point: none,
      gradient: none,
      step,
      cost: cost(step),
      slope: slope(step),
    });
    let evaluations = 0;
    const steps = searchLine(at(0), firstStep, function* (step) {
      evaluations++;
      yield;
      return at(step);
    });
    for (;;) {
      const { done, value } = steps.next();
      if (done) return { start: at(0), found: value, evaluations };
    }
  }

  // Moré and Thuente, ACM Trans. Math. Softw. 20, 286 (1994), give the first two of these as tests of line
  // searches (from memory).
  it.each([
    ['-x/(x^2 + 2)', (x: number) => -x / (x * x + 2), (x: number) => (x * x - 2) / (x * x + 2) ** 2],
    [
      '(x + 0.004)^5 - 2 (x + 0.004)^4',
      (x: number) => (x + 0.004) ** 5 - 2 * (x + 0.004) ** 4,
      (x: number) => 5 * (x + 0.004) ** 4 - 8 * (x + 0.004) ** 3,
    ],
    ['cos x', (x: number) => Math.cos(x + 0.1), (x: number) => -Math.sin(x + 0.1)],
    ['x^2 - x', (x: number) => x * x - x, (x: number) => 2 * x - 1],
  ] as const)('finds a step that meets the strong Wolfe conditions: %s', (_name, cost, slope) => {
    for (const firstStep of [1e-3, 0.1, 1, 10, 1000]) {
      const { start, found, evaluations } = search(cost, slope, firstStep);
      expect(found!.cost).toBeLessThanOrEqual(start.cost + 1e-4 * found!.step * start.slope);
      expect(Math.abs(found!.slope)).toBeLessThanOrEqual(0.9 * Math.abs(start.slope));
      expect(evaluations).toBeLessThan(20);
    }
  });

  it('ends at a kink with less cost, and gives up where there is none to be had', () => {
    const kink = search(
      (x) => Math.abs(x - 0.3),
      (x) => (x < 0.3 ? -1 : 1),
      1,
    );
    expect(kink.found!.cost).toBeLessThan(1e-3);
    const rising = search(
      (x) => x,
      () => -1,
      1,
    );
    expect(rising.found).toBeNull();
    expect(rising.evaluations).toBeLessThan(30);
  });
});

import { describe, expect, it } from 'vitest';
import type { MinimisationProgress } from '../../src/optimise/minimise.js';
import { minimise, minimiseInterruptibly } from '../../src/optimise/minimise.js';
import type { CostAndGradient } from '../../src/optimise/Problem.js';
import { randomStream } from '../../src/random/RandomStream.js';

/** Rosenbrock, Comput. J. 3, 175 (1960), chained over n variables; its minimum is 0 at (1, ..., 1). */
const rosenbrock: CostAndGradient = (x, gradient) => {
  gradient.fill(0);
  let cost = 0;
  for (let k = 0; k + 1 < x.length; k++) {
    const [a, b] = [1 - x[k]!, x[k + 1]! - x[k]! ** 2];
    cost += a * a + 100 * b * b;
    gradient[k]! += -2 * a - 400 * x[k]! * b;
    gradient[k + 1]! += 200 * b;
  }
  return cost;
};

/** Half x^T A x - b^T x for a symmetric matrix held by rows. */
const quadratic =
  (matrix: readonly Float64Array[], b: Float64Array): CostAndGradient =>
  (x, gradient) => {
    let cost = 0;
    for (let i = 0; i < x.length; i++) {
      const row = matrix[i]!.reduce((sum, value, j) => sum + value * x[j]!, 0);
      gradient[i] = row - b[i]!;
      cost += x[i]! * (row / 2 - b[i]!);
    }
    return cost;
  };

/** A matrix B B^T + I, of a fixed stream: positive definite, condition of some hundreds. */
function positiveDefinite(size: number, seed: number): Float64Array[] {
  const random = randomStream(seed, 902);
  const factor = Array.from({ length: size }, () =>
    Float64Array.from({ length: size }, () => random.normal()),
  );
  return factor.map((a, i) =>
    Float64Array.from(factor, (b, j) => a.reduce((sum, x, k) => sum + x * b[k]!, i === j ? 1 : 0)),
  );
}

function timesVector(matrix: readonly Float64Array[], x: Float64Array): Float64Array {
  return Float64Array.from(matrix, (row) => row.reduce((sum, value, j) => sum + value * x[j]!, 0));
}

/** Half (x - m)^T A (x - m): its minimum is 0 at m, and no rounding of a cost far from 0 hides it. */
function knownQuadratic(
  size: number,
  seed: number,
): { readonly cost: CostAndGradient; readonly minimum: Float64Array } {
  const centred = quadratic(positiveDefinite(size, seed), new Float64Array(size));
  const minimum = Float64Array.from({ length: size }, (_, k) => Math.sin(3 * k + 1));
  return {
    cost: (x, gradient) =>
      centred(
        x.map((value, k) => value - minimum[k]!),
        gradient,
      ),
    minimum,
  };
}

describe('minimise', () => {
  it('finds the minimum of Rosenbrock functions', () => {
    for (const size of [2, 10, 50]) {
      const start = Float64Array.from({ length: size }, (_, k) => (k % 2 === 0 ? -1.2 : 1));
      const found = minimise(rosenbrock, start, { gradientWithin: 1e-8, mostIterations: 5000 });
      expect(found.stopped).toBe('gradient');
      // The chain has a second, worse minimum near x1 = -1; from here the descent ends in the global one.
      expect(found.cost).toBeLessThan(1e-14);
      found.point.forEach((x) => expect(x).toBeCloseTo(1, 7));
    }
  });

  it('finds the known minimum of a quadratic, 1 to 40 variables', () => {
    for (const size of [1, 2, 7, 40]) {
      const { cost, minimum } = knownQuadratic(size, size);
      const found = minimise(cost, new Float64Array(size));
      found.point.forEach((x, k) => expect(x).toBeCloseTo(minimum[k]!, 8));
      expect(found.gradientNorm).toBeLessThan(1e-9);
    }
  });

  // Built backwards from the conditions of Karush, Kuhn and Tucker: a point x in the box and multipliers m that
  // are 0 inside, positive at a lower and negative at an upper limit. With b = A x - m the gradient at x is m,
  // so x is the minimum in the box, and the only one.
  it('finds the one point in a box that meets the conditions of Karush, Kuhn and Tucker', () => {
    const size = 30;
    for (let seed = 1; seed <= 10; seed++) {
      const random = randomStream(seed, 903);
      const matrix = positiveDefinite(size, 100 + seed);
      const minimum = Float64Array.from({ length: size }, () => random.normal());
      const box = {
        low: minimum.map((x) => x - random.uniform()),
        high: minimum.map((x) => x + random.uniform()),
      };
      const multipliers = new Float64Array(size);
      for (let k = 0; k < size; k++) {
        const place = Math.floor(4 * random.uniform());
        if (place === 0) [box.low[k], multipliers[k]] = [minimum[k]!, 0.1 + 3 * random.uniform()];
        else if (place === 1) [box.high[k], multipliers[k]] = [minimum[k]!, -0.1 - 3 * random.uniform()];
        // Held: no room at all, and a multiplier of any sign.
        else if (place === 2)
          [box.low[k], box.high[k], multipliers[k]] = [minimum[k]!, minimum[k]!, random.normal()];
      }
      const pulled = timesVector(matrix, minimum).map((value, k) => value - multipliers[k]!);
      const outside = Float64Array.from({ length: size }, () => 10 * random.normal());
      const found = minimise(quadratic(matrix, pulled), outside, { box });
      found.point.forEach((x, k) => expect(x, `seed ${seed}, variable ${k}`).toBeCloseTo(minimum[k]!, 7));
      found.point.forEach((x, k) => {
        expect(x).toBeGreaterThanOrEqual(box.low[k]!);
        expect(x).toBeLessThanOrEqual(box.high[k]!);
      });
      expect(found.evaluations).toBeLessThan(400);
    }
  });

  it('leaves a limit at which it starts, where the gradient vanishes in no smooth substitute', () => {
    const box = { low: Float64Array.of(-1, 0), high: Float64Array.of(3, 2) };
    const cost: CostAndGradient = (x, gradient) => {
      gradient.set([2 * (x[0]! - 1), 2 * (x[1]! + 5)]);
      return (x[0]! - 1) ** 2 + (x[1]! + 5) ** 2;
    };
    const found = minimise(cost, Float64Array.of(3, 2), { box });
    expect(found.point[0]).toBeCloseTo(1, 9);
    expect(found.point[1]).toBe(0);
    expect(found.stopped).toBe('gradient');
  });

  it('never returns worse than it began, whatever the gradient claims', () => {
    const lying: CostAndGradient = (x, gradient) => {
      gradient.fill(-1);
      return x.reduce((sum, value) => sum + value * value, 0);
    };
    const found = minimise(lying, Float64Array.of(0.1, 0.2));
    expect(found.cost).toBeCloseTo(0.05, 15);
    expect(found.stopped).toBe('stall');
  });

  it('steps round places where the cost is no number', () => {
    const cost: CostAndGradient = (x, gradient) => {
      gradient[0] = 1 - 1 / x[0]!;
      return x[0]! - Math.log(x[0]!);
    };
    expect(minimise(cost, Float64Array.of(20)).point[0]).toBeCloseTo(1, 8);
    expect(() => minimise(cost, Float64Array.of(-1))).toThrow(RangeError);
  });

  it('ends after the iterations or the time granted, with the best so far', () => {
    const start = Float64Array.of(-1.2, 1);
    const few = minimise(rosenbrock, start, { mostIterations: 3 });
    expect([few.stopped, few.iterations]).toEqual(['iterations', 3]);
    let time = 0;
    // The clock advances by a second each time it is looked at.
    const late = minimise(rosenbrock, start, { mostSeconds: 12, now: () => 1000 * time++ });
    expect(late.stopped).toBe('time');
    expect(late.evaluations).toBeLessThanOrEqual(12);
    for (const { cost } of [few, late]) expect(cost).toBeLessThan(24.2);
  });

  it('reports falling costs and can be interrupted from a timer', async () => {
    const seen: MinimisationProgress[] = [];
    const controller = new AbortController();
    const slow: CostAndGradient = (x, gradient) => {
      const end = performance.now() + 3;
      while (performance.now() < end);
      return rosenbrock(x, gradient);
    };
    const start = Float64Array.from({ length: 60 }, (_, k) => Math.sin(k));
    const found = await minimiseInterruptibly(slow, start, {
      signal: controller.signal,
      onProgress: (progress) => {
        if (seen.push(progress) === 3) setTimeout(() => controller.abort(), 0);
      },
      gradientWithin: 0,
      stallWithin: 0,
    });
    expect(found.stopped).toBe('interrupted');
    expect(seen.length).toBeGreaterThanOrEqual(3);
    seen.forEach(({ cost }, k) => expect(cost).toBeLessThan(k === 0 ? Infinity : seen[k - 1]!.cost));
    expect(found.cost).toBeLessThanOrEqual(seen.at(-1)!.cost);
    expect(found.cost).toBe(rosenbrock(found.point, new Float64Array(60)));
  });

  it('takes the same steps with and without pauses', async () => {
    const start = Float64Array.from({ length: 20 }, (_, k) => Math.cos(k));
    expect(await minimiseInterruptibly(rosenbrock, start)).toEqual(minimise(rosenbrock, start));
  });

  it('refuses a box that is empty or of another size', () => {
    const box = { low: Float64Array.of(1), high: Float64Array.of(0) };
    expect(() => minimise(rosenbrock, Float64Array.of(0), { box })).toThrow(RangeError);
    expect(() => minimise(rosenbrock, Float64Array.of(0, 0), { box })).toThrow(RangeError);
  });
});

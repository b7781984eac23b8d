import type { Evaluated } from './Problem.js';

/** A step, the change of the gradient over it, and their product. */
interface Pair {
  readonly step: Float64Array;
  readonly change: Float64Array;
  readonly curvature: number;
}

/** What the last steps tell of the cost's curvature: the limited memory of L-BFGS. */
export interface CurvatureMemory {
  /** Takes up a step and the change of the gradient over it, in place of the oldest when the memory is full. */
  remember(from: Evaluated, to: Evaluated): void;
  forget(): void;
  readonly size: number;
  /**
   * Overwrites a vector with the approximate inverse of the Hessian times it, in the variables that are free.
   * Entries of the others must be 0 and stay 0. Cost 4 n multiplications a pair.
   * @param held indices of the variables that are not free
   */
  multiplyInPlace(vector: Float64Array, held: readonly number[]): void;
}

/** Curvature along a step below this share of the change's squared length says nothing. */
const LEAST_CURVATURE = 1e-14;

/**
 * The limited-memory approximation of the inverse Hessian by BFGS updates: the two-loop recursion, Nocedal and
 * Wright, Numerical Optimization, algorithm 7.4, scaled by equation 7.20 (from memory).
 *
 * Steps and changes are cut down to the free variables. A pair whose curvature there is not positive is passed
 * over, so the matrix is positive definite on the free variables whichever they are.
 */
export function createCurvatureMemory(capacity: number): CurvatureMemory {
  const pairs: Pair[] = [];
  // Making an array takes longer than filling it: those of forgotten pairs are used again.
  const spare: Pair[] = [];
  return {
    remember: (from, to) => {
      if (pairs.length === capacity) spare.push(pairs.shift()!);
      const size = from.point.length;
      const { step, change } = spare.pop() ?? {
        step: new Float64Array(size),
        change: new Float64Array(size),
      };
      differenceInto(step, to.point, from.point);
      differenceInto(change, to.gradient, from.gradient);
      pairs.push({ step, change, curvature: product(step, change) });
    },
    forget: () => {
      spare.push(...pairs.splice(0));
    },
    get size() {
      return pairs.length;
    },
    multiplyInPlace: (vector, held) => {
      const used: { readonly pair: Pair; readonly inverse: number; readonly share: number }[] = [];
      let scale = 0;
      for (let k = pairs.length - 1; k >= 0; k--) {
        const pair = pairs[k]!;
        const { step, change } = pair;
        const curvature = pair.curvature - partOf(step, change, held);
        if (!(curvature > 0)) continue;
        if (scale === 0) {
          const square = product(change, change) - partOf(change, change, held);
          if (!(curvature > LEAST_CURVATURE * square)) continue;
          scale = curvature / square;
        }
        const inverse = 1 / curvature;
        // The vector is 0 where variables are held, so whole products are those of the free ones.
        const share = inverse * product(step, vector);
        addInPlace(vector, -share, change, held);
        used.push({ pair, inverse, share });
      }
      if (scale > 0) for (let k = 0; k < vector.length; k++) vector[k]! *= scale;
      for (const { pair, inverse, share } of used.reverse()) {
        addInPlace(vector, share - inverse * product(pair.change, vector), pair.step, held);
      }
    },
  };
}

/** The sum of products; four sums side by side, since each addition waits for the one before. */
function product(a: Float64Array, b: Float64Array): number {
  const whole = a.length & ~3;
  let [s0, s1, s2, s3] = [0, 0, 0, 0];
  for (let k = 0; k < whole; k += 4) {
    s0 += a[k]! * b[k]!;
    s1 += a[k + 1]! * b[k + 1]!;
    s2 += a[k + 2]! * b[k + 2]!;
    s3 += a[k + 3]! * b[k + 3]!;
  }
  for (let k = whole; k < a.length; k++) s0 += a[k]! * b[k]!;
  return s0 + s1 + (s2 + s3);
}

function differenceInto(out: Float64Array, a: Float64Array, b: Float64Array): void {
  for (let k = 0; k < out.length; k++) out[k] = a[k]! - b[k]!;
}

/** The part of a product that some variables contribute. */
function partOf(a: Float64Array, b: Float64Array, variables: readonly number[]): number {
  let sum = 0;
  for (const k of variables) sum += a[k]! * b[k]!;
  return sum;
}

/** Adds a multiple of another vector, except in the variables that are held. */
function addInPlace(
  vector: Float64Array,
  factor: number,
  other: Float64Array,
  held: readonly number[],
): void {
  for (let k = 0; k < vector.length; k++) vector[k]! += factor * other[k]!;
  for (const k of held) vector[k] = 0;
}

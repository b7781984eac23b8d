/** A step and the change of the gradient over it. */
interface Pair {
  readonly step: Float64Array;
  readonly change: Float64Array;
}

/** What the last steps tell of the cost's curvature: the limited memory of L-BFGS. */
export interface CurvatureMemory {
  /** Takes up a step and the change of the gradient over it, in place of the oldest when the memory is full. */
  remember(step: Float64Array, change: Float64Array): void;
  forget(): void;
  readonly size: number;
  /**
   * Overwrites a vector with the approximate inverse of the Hessian times it, in the variables that are free.
   * Entries of the others must be 0 and stay 0. Cost about 6 n operations a pair.
   * @param free 1 for a free variable, 0 for one that is held
   */
  multiplyInPlace(vector: Float64Array, free: Uint8Array): void;
}

/** Curvature along a step below this share of the change's length says nothing. */
const LEAST_CURVATURE = 1e-14;

/**
 * The limited-memory approximation of the inverse Hessian by BFGS updates: the two-loop recursion, Nocedal and
 * Wright, Numerical Optimization, algorithm 7.4, scaled by equation 7.20 (from memory).
 *
 * Steps and changes are cut down to the free variables first. A pair whose curvature there is not positive is
 * passed over, so the matrix is positive definite on the free variables whichever they are.
 */
export function createCurvatureMemory(capacity: number): CurvatureMemory {
  const pairs: Pair[] = [];
  return {
    remember: (step, change) => {
      if (pairs.length === capacity) pairs.shift();
      pairs.push({ step, change });
    },
    forget: () => {
      pairs.length = 0;
    },
    get size() {
      return pairs.length;
    },
    multiplyInPlace: (vector, free) => {
      const used: { readonly pair: Pair; readonly inverse: number; readonly share: number }[] = [];
      let scale = 0;
      for (let k = pairs.length - 1; k >= 0; k--) {
        const pair = pairs[k]!;
        const curvature = freeProduct(pair.step, pair.change, free);
        const square = freeProduct(pair.change, pair.change, free);
        if (!(curvature > LEAST_CURVATURE * square)) continue;
        if (scale === 0) scale = curvature / square;
        const inverse = 1 / curvature;
        const share = inverse * freeProduct(pair.step, vector, free);
        addInPlace(vector, -share, pair.change, free);
        used.push({ pair, inverse, share });
      }
      if (scale > 0) for (let k = 0; k < vector.length; k++) vector[k]! *= scale;
      for (const { pair, inverse, share } of used.reverse()) {
        addInPlace(vector, share - inverse * freeProduct(pair.change, vector, free), pair.step, free);
      }
    },
  };
}

function freeProduct(a: Float64Array, b: Float64Array, free: Uint8Array): number {
  let sum = 0;
  for (let k = 0; k < a.length; k++) sum += a[k]! * b[k]! * free[k]!;
  return sum;
}

function addInPlace(vector: Float64Array, factor: number, other: Float64Array, free: Uint8Array): void {
  for (let k = 0; k < vector.length; k++) vector[k]! += factor * other[k]! * free[k]!;
}

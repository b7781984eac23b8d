/** Writes the gradient at a point into `gradient` and returns the cost there. Neither array may be kept. */
export type CostAndGradient = (point: Float64Array, gradient: Float64Array) => number;

/** Least and greatest value of every variable, both ends included; infinite where there is none. */
export interface Box {
  readonly low: Float64Array;
  readonly high: Float64Array;
}

/** A point where the cost has been evaluated. */
export interface Evaluated {
  readonly point: Float64Array;
  readonly gradient: Float64Array;
  /** Infinity where the cost is no number. */
  readonly cost: number;
}

/** Moves every variable to the nearest value that the box allows it. */
export function projectInPlace(point: Float64Array, { low, high }: Box): void {
  for (let k = 0; k < point.length; k++) point[k] = Math.min(Math.max(point[k]!, low[k]!), high[k]!);
}

/**
 * How far the point is from stationary: the longest move in one variable that a step of minus the gradient
 * makes within the box. Without limits, the largest entry of the gradient. 0 is the condition of Karush, Kuhn
 * and Tucker.
 */
export function projectedGradientNorm({ point, gradient }: Evaluated, { low, high }: Box): number {
  let norm = 0;
  for (let k = 0; k < point.length; k++) {
    const x = point[k]! - gradient[k]!;
    const moved = x < low[k]! ? low[k]! : x > high[k]! ? high[k]! : x;
    // Passes on what is no number.
    norm = Math.max(norm, Math.abs(moved - point[k]!));
  }
  return norm;
}

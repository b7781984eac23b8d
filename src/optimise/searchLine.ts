import type { Evaluated } from './Problem.js';

/** A point on the line of a search. */
export interface LinePoint extends Evaluated {
  readonly step: number;
  /** Derivative of the cost along the line. */
  readonly slope: number;
}

/** Evaluates the cost at a step along the line, leaving the caller room to stop after each evaluation. */
export type EvaluateStep = (step: number) => Generator<void, LinePoint>;

/** Share of the decrease that the slope at the start promises which a step must bring. */
const SUFFICIENT = 1e-4;
/** Share of the slope at the start to which the slope must have flattened. */
const CURVATURE = 0.9;
const MOST_EVALUATIONS = 25;

/**
 * Looks for a step along a line that meets the strong Wolfe conditions: cost(step) <= cost(0) + c1 step
 * slope(0) and |slope(step)| <= c2 |slope(0)|. Nocedal and Wright, Numerical Optimization, algorithms 3.5
 * and 3.6 (from memory).
 *
 * Where the line has a kink no step may meet the second condition, and near a minimum rounding may hide the
 * first; the search then ends with the best step of sufficient decrease that it has met.
 *
 * @param start the line's beginning, with a slope below 0
 * @returns null when no step brought a sufficient decrease
 */
export function* searchLine(
  start: LinePoint,
  firstStep: number,
  evaluate: EvaluateStep,
): Generator<void, LinePoint | null> {
  let previous = start;
  let step = firstStep;
  for (let evaluations = 1; evaluations <= MOST_EVALUATIONS; evaluations++) {
    const current = yield* evaluate(step);
    const left = MOST_EVALUATIONS - evaluations;
    if (!isSufficient(current, start) || (evaluations > 1 && current.cost >= previous.cost)) {
      return yield* zoom(start, previous, current, evaluate, left);
    }
    if (Math.abs(current.slope) <= -CURVATURE * start.slope) return current;
    if (current.slope >= 0) return yield* zoom(start, current, previous, evaluate, left);
    step = beyond(previous, current);
    previous = current;
  }
  return previous;
}

/**
 * Narrows an interval that holds good steps: `low` has the lowest cost of all sufficient steps so far, and
 * its slope points towards `high`.
 */
function* zoom(
  start: LinePoint,
  low: LinePoint,
  high: LinePoint,
  evaluate: EvaluateStep,
  evaluations: number,
): Generator<void, LinePoint | null> {
  for (; evaluations > 0; evaluations--) {
    const width = Math.abs(high.step - low.step);
    if (!(width > 4 * Number.EPSILON * Math.max(low.step, high.step))) break;
    const current = yield* evaluate(between(low, high));
    if (!isSufficient(current, start) || current.cost >= low.cost) {
      high = current;
      continue;
    }
    if (Math.abs(current.slope) <= -CURVATURE * start.slope) return current;
    if (current.slope * (high.step - low.step) >= 0) high = low;
    low = current;
  }
  return low.step > 0 ? low : null;
}

function isSufficient(current: LinePoint, start: LinePoint): boolean {
  return current.cost <= start.cost + SUFFICIENT * current.step * start.slope;
}

/** A step between two others, a tenth of the interval away from both: where their cubic has its minimum. */
function between(low: LinePoint, high: LinePoint): number {
  const width = high.step - low.step;
  const share = (cubicMinimum(low, high) - low.step) / width;
  // An unknown share (no number) becomes a half.
  return low.step + width * (share >= 0 && share <= 1 ? Math.min(Math.max(share, 0.1), 0.9) : 0.5);
}

/** A step behind the last one, by at least its distance from the one before and at most ten times that. */
function beyond(previous: LinePoint, current: LinePoint): number {
  const width = current.step - previous.step;
  const ahead = (cubicMinimum(previous, current) - current.step) / width;
  return current.step + width * (ahead >= 0 ? Math.min(Math.max(ahead, 1), 10) : 4);
}

/** Minimum of the cubic through the costs and slopes at two steps (Nocedal and Wright, equation 3.59). */
function cubicMinimum(a: LinePoint, b: LinePoint): number {
  const d1 = a.slope + b.slope - (3 * (a.cost - b.cost)) / (a.step - b.step);
  const d2 = Math.sign(b.step - a.step) * Math.sqrt(d1 * d1 - a.slope * b.slope);
  return b.step - ((b.step - a.step) * (b.slope + d2 - d1)) / (b.slope - a.slope + 2 * d2);
}

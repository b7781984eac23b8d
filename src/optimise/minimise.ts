import { createCurvatureMemory } from './CurvatureMemory.js';
import type { Box, CostAndGradient, Evaluated } from './Problem.js';
import { projectedGradientNorm, projectInPlace } from './Problem.js';
import type { LinePoint } from './searchLine.js';
import { searchLine } from './searchLine.js';

/**
 * Why a minimisation ended: the gradient has vanished, the cost no longer falls, the iterations or the time
 * granted are used up, or the signal was aborted.
 */
export type StopReason = 'gradient' | 'stall' | 'iterations' | 'time' | 'interrupted';

/** How far a minimisation has come. */
export interface MinimisationProgress {
  readonly iterations: number;
  readonly evaluations: number;
  readonly cost: number;
  readonly gradientNorm: number;
}

/** The best point seen. */
export interface Minimum extends MinimisationProgress {
  readonly point: Float64Array;
  readonly stopped: StopReason;
}

/** Limits of a minimisation and how it is watched. */
export interface MinimiseOptions {
  /** Limits of the variables; none by default. */
  readonly box?: Box;
  /** Ends it with the best so far when aborted; looked at after every evaluation. */
  readonly signal?: AbortSignal;
  /** Called after every iteration. */
  readonly onProgress?: (progress: MinimisationProgress) => void;
  /** 1000 by default. */
  readonly mostIterations?: number;
  /** No limit by default. */
  readonly mostSeconds?: number;
  /** Ends it when the projected gradient's largest entry is as small as this; 1e-9 by default. */
  readonly gradientWithin?: number;
  /**
   * Ends it when the cost has fallen by no more than this share of itself over the last `stallIterations`
   * iterations; 1e-9 by default.
   */
  readonly stallWithin?: number;
  /** 10 by default. */
  readonly stallIterations?: number;
  /** Pairs of steps and changes of the gradient that are kept; 10 by default. */
  readonly memory?: number;
  /** The time in milliseconds, from any beginning; by default that of the platform. */
  readonly now?: () => number;
}

/** Time between pauses of {@link minimiseInterruptibly} in milliseconds. */
const BETWEEN_PAUSES = 50;
/** Variables so near to a limit that the gradient pushes them against are taken to be at it. */
const NEAR_LIMIT = 1e-3;

/**
 * Looks for a local minimum of a cost by L-BFGS with a strong Wolfe line search: Nocedal and Wright, Numerical
 * Optimization, algorithms 7.5, 3.5 and 3.6 (from memory). What is returned is the best point seen, never worse
 * than the start.
 *
 * Limits are met by the two-metric projection of Bertsekas, SIAM J. Control Optim. 20, 221 (1982) (from
 * memory): variables at a limit that the gradient pushes them against are held, L-BFGS works in the subspace of
 * all others, and the line of the search is bent along the box's faces, so that one step can meet many limits.
 * Chosen over a smooth change of variables, whose gradient vanishes at the limits: a start with phases stopped
 * at the ends of their ranges would never leave them.
 *
 * @param start moved into the box where it lies outside; the comparison with the start is with that point
 * @throws RangeError when the cost at the start is no number, or the box is empty
 */
export function minimise(
  costAndGradient: CostAndGradient,
  start: Float64Array,
  options: MinimiseOptions = {},
): Minimum {
  const run = createRun(costAndGradient, start, options);
  const steps = run.iterate();
  for (;;) {
    const { done, value } = steps.next();
    const stopped = done ? value : run.mustStop();
    if (stopped) return run.minimum(stopped);
  }
}

/** The same, with pauses now and then that let timers and signals in. */
export async function minimiseInterruptibly(
  costAndGradient: CostAndGradient,
  start: Float64Array,
  options: MinimiseOptions = {},
): Promise<Minimum> {
  const now = options.now ?? platformTime;
  const run = createRun(costAndGradient, start, options);
  const steps = run.iterate();
  let paused = now();
  for (;;) {
    const { done, value } = steps.next();
    if (now() - paused >= BETWEEN_PAUSES) {
      await new Promise((resolve) => setTimeout(resolve, 0));
      paused = now();
    }
    const stopped = done ? value : run.mustStop();
    if (stopped) return run.minimum(stopped);
  }
}

const platformTime = (): number => performance.now();

interface Run {
  /** Yields after every evaluation of the cost. */
  iterate(): Generator<void, StopReason>;
  mustStop(): StopReason | null;
  minimum(stopped: StopReason): Minimum;
}

function createRun(costAndGradient: CostAndGradient, start: Float64Array, options: MinimiseOptions): Run {
  const { signal, onProgress, mostSeconds = Infinity, now = platformTime } = options;
  const { mostIterations = 1000, gradientWithin = 1e-9, stallWithin = 1e-9, stallIterations = 10 } = options;
  const size = start.length;
  const box = options.box ?? everywhere(size);
  requireBox(box, size);
  const curvature = createCurvatureMemory(options.memory ?? 10);
  const towards = new Float64Array(size);
  const began = now();
  let iterations = 0;
  let evaluations = 0;

  function evaluateAt(point: Float64Array): Evaluated {
    const gradient = new Float64Array(size);
    const cost = costAndGradient(point, gradient);
    evaluations++;
    const evaluated = { point, gradient, cost: Number.isFinite(cost) ? cost : Infinity };
    if (evaluations === 1 || evaluated.cost < best.cost) best = evaluated;
    return evaluated;
  }

  const first = start.slice();
  projectInPlace(first, box);
  let best: Evaluated = { point: first, gradient: first, cost: Infinity };
  let current = evaluateAt(first);
  if (current.cost === Infinity) throw new RangeError('the cost at the start is no finite number');

  /**
   * The direction of the next step: towards the limit for a variable that stands near it with the gradient
   * pushing against it, and by the inverse Hessian in the subspace of all others.
   */
  function setDirection(norm: number): void {
    const { point, gradient } = current;
    const near = Math.min(NEAR_LIMIT, norm);
    towards.set(gradient);
    const held: number[] = [];
    for (let k = 0; k < size; k++) {
      const slope = gradient[k]!;
      const [low, high] = [box.low[k]!, box.high[k]!];
      const pushed = slope > 0 ? point[k]! - low <= near : slope < 0 && high - point[k]! <= near;
      if (!pushed && low < high) continue;
      held.push(k);
      towards[k] = 0;
    }
    curvature.multiplyInPlace(towards, held);
    for (let k = 0; k < size; k++) towards[k] = -towards[k]!;
    for (const k of held) towards[k] = (gradient[k]! > 0 ? box.low[k]! : box.high[k]!) - point[k]!;
  }

  /** A whole quasi-Newton step; along the bare gradient none by more than 1 in any variable. */
  function firstStep(): number {
    if (curvature.size > 0) return 1;
    return 1 / towards.reduce((longest, way) => Math.max(longest, Math.abs(way)), 1);
  }

  /** A point on the line through the current one, bent along the faces of the box. */
  function* evaluateStep(step: number): Generator<void, LinePoint> {
    const { point: from } = current;
    const { low, high } = box;
    const point = new Float64Array(size);
    for (let k = 0; k < size; k++) {
      const x = from[k]! + step * towards[k]!;
      point[k] = x < low[k]! ? low[k]! : x > high[k]! ? high[k]! : x;
    }
    const evaluated = evaluateAt(point);
    yield;
    return { ...evaluated, step, slope: slopeAlong(evaluated, towards, box) };
  }

  function* iterate(): Generator<void, StopReason> {
    yield;
    const costs = [current.cost];
    for (;;) {
      const norm = projectedGradientNorm(current, box);
      if (norm <= gradientWithin) return 'gradient';
      if (iterations >= mostIterations) return 'iterations';
      setDirection(norm);
      const from: LinePoint = { ...current, step: 0, slope: slopeAlong(current, towards, box) };
      const found = from.slope < 0 ? yield* searchLine(from, firstStep(), evaluateStep) : null;
      if (found === null) {
        // Once more along the gradient; when that does not help either, rounding hides the way.
        if (curvature.size === 0) return 'stall';
        curvature.forget();
        continue;
      }
      curvature.remember(current, found);
      current = found;
      iterations++;
      onProgress?.({ iterations, evaluations, cost: current.cost, gradientNorm: norm });
      costs.push(current.cost);
      const before = costs[costs.length - 1 - stallIterations];
      if (before !== undefined && before - current.cost <= stallWithin * Math.abs(before)) {
        return projectedGradientNorm(current, box) <= gradientWithin ? 'gradient' : 'stall';
      }
    }
  }

  return {
    iterate,
    mustStop: () => {
      if (signal?.aborted) return 'interrupted';
      return now() - began >= 1000 * mostSeconds ? 'time' : null;
    },
    minimum: (stopped) => ({
      point: best.point,
      cost: best.cost,
      gradientNorm: projectedGradientNorm(best, box),
      iterations,
      evaluations,
      stopped,
    }),
  };
}

/** Derivative of the cost along a direction, without the variables that a limit stops. */
function slopeAlong({ point, gradient }: Evaluated, towards: Float64Array, { low, high }: Box): number {
  let slope = 0;
  for (let k = 0; k < point.length; k++) {
    const way = towards[k]!;
    const stops = way > 0 ? point[k]! >= high[k]! : point[k]! <= low[k]!;
    if (!stops) slope += gradient[k]! * way;
  }
  return slope;
}

function everywhere(size: number): Box {
  return { low: new Float64Array(size).fill(-Infinity), high: new Float64Array(size).fill(Infinity) };
}

function requireBox({ low, high }: Box, size: number): void {
  if (low.length !== size || high.length !== size) {
    throw new RangeError(`limits of ${low.length} and ${high.length} variables for ${size}`);
  }
  for (let k = 0; k < size; k++) {
    if (!(low[k]! <= high[k]!))
      throw new RangeError(`variable ${k} has no value from ${low[k]} to ${high[k]}`);
  }
}

import type { Chip, PhaseRange } from '../chip/Chip.js';
import type { Settings } from '../chip/Settings.js';
import { listShifters, phasesInOrder, settingsFromPhases } from '../chip/shifters.js';
import { turnIntoRange } from '../chip/turns.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { zeroMatrix } from '../matrix/ComplexMatrix.js';
import type { Cost, CostDescription } from '../merit/createCost.js';
import { createCost } from '../merit/createCost.js';
import type { Minimum, MinimiseOptions, StopReason } from '../optimise/minimise.js';
import { minimise, minimiseInterruptibly } from '../optimise/minimise.js';
import type { Box, CostAndGradient } from '../optimise/Problem.js';
import { projectInPlace } from '../optimise/Problem.js';
import { randomStream } from '../random/RandomStream.js';
import { STREAMS } from '../random/streams.js';
import type { FieldMemory, FieldSweep } from '../simulate/createFieldSweep.js';
import { createFieldSweep, reserveFieldMemory } from '../simulate/createFieldSweep.js';

/** A shifter that cannot be set: it stays at its phase. */
export interface HeldShifter {
  /** Index (from 0) of the shifter in the phase table's order. */
  readonly shifterIndex: number;
  readonly phaseRad: number;
}

/**
 * How a refinement is limited and watched. By default it ends after 5000 iterations, or when the cost has
 * fallen by less than one part in 100,000 over 20.
 */
export interface RefineOptions extends Omit<MinimiseOptions, 'box'> {
  /** Shifters that stay at a phase, whatever their range. */
  readonly held?: readonly HeldShifter[];
  /** Kernel memory for the chip's mesh and the cost's inputs, to use it again for the next chip. */
  readonly fields?: FieldMemory;
}

/** The best phases that a refinement has found. */
export interface RefinedSettings {
  readonly settings: Settings;
  /** Cost of the best start, once its phases were in range and the held shifters at their phases. */
  readonly costBefore: number;
  readonly cost: number;
  /** The figure of merit that the cost is for, on the chosen ports: before and after. */
  readonly figureBefore: number;
  readonly figure: number;
  readonly iterations: number;
  readonly evaluations: number;
  readonly gradientNorm: number;
  readonly stopped: StopReason;
}

/**
 * Refines phases: looks for a local minimum of a cost over all phases of a chip at once, from the best of some
 * starts, by L-BFGS with the cost's exact gradient. Everything that the chip's description says is part of it:
 * ratios, losses, ranges. Never returns worse than the best start.
 *
 * Where a shifter's range is a whole turn or more, its phase moves freely and is brought back by turns at the
 * end; without a range, to [0, 2 pi). A differential internal phase has period 4 pi and comes back to [0, 4
 * pi), since 2 pi less would change the sign of its cell's light (conventions, section 5). Phases that the
 * cost does not depend on stay as they are in the start.
 *
 * @param target N x N unitary
 * @param starts at least one; phases out of range are moved into it first
 * @throws RangeError for a target or start of another size, no start at all, a held shifter that does not exist or a field memory
 * of another mesh; what createCost throws
 */
export function refineSettings(
  chip: Chip,
  target: ComplexMatrix,
  starts: readonly Settings[],
  description: CostDescription,
  options: RefineOptions = {},
): RefinedSettings {
  const refinement = prepare(chip, target, starts, description, options);
  return refinement.finish(minimise(refinement.costAndGradient, refinement.start, refinement.options));
}

/** The same, with pauses now and then that let timers and signals in. */
export async function refineInterruptibly(
  chip: Chip,
  target: ComplexMatrix,
  starts: readonly Settings[],
  description: CostDescription,
  options: RefineOptions = {},
): Promise<RefinedSettings> {
  const refinement = prepare(chip, target, starts, description, options);
  return refinement.finish(
    await minimiseInterruptibly(refinement.costAndGradient, refinement.start, refinement.options),
  );
}

/**
 * A chip's cost falls ever more slowly where cells are out of reach: the end comes when it falls by less than
 * one part in 100,000 over 20 iterations.
 */
const DEFAULTS: MinimiseOptions = { mostIterations: 5000, stallWithin: 1e-5, stallIterations: 20 };

interface Refinement {
  readonly costAndGradient: CostAndGradient;
  readonly start: Float64Array;
  readonly options: MinimiseOptions;
  finish(minimum: Minimum): RefinedSettings;
}

function prepare(
  chip: Chip,
  target: ComplexMatrix,
  starts: readonly Settings[],
  description: CostDescription,
  { held = [], fields, ...options }: RefineOptions,
): Refinement {
  const { modes } = chip.mesh;
  if (target.rows !== modes || target.columns !== modes) {
    throw new RangeError(`a target of ${target.rows} x ${target.columns} for a chip of ${modes} ports`);
  }
  const cost = createCost(target, description);
  if (fields && !(fields.mesh === chip.mesh && fields.inputs.join() === cost.inputs.join())) {
    throw new RangeError('the field memory was reserved for another mesh or for other inputs');
  }
  const sweep = createFieldSweep(chip, fields ?? reserveFieldMemory(chip.mesh, cost.inputs));
  const slope = zeroMatrix(modes, cost.inputs.length);
  const limits = limitsOfShifters(chip, held);
  const begin = bestStart(
    starts.map((settings) => limits.bringIn(phasesInOrder(chip, settings))),
    sweep,
    cost,
    slope,
  );
  const kicked = kick(begin, modes);
  projectInPlace(kicked, limits.box);
  return {
    costAndGradient: (phases, gradient) => {
      const value = cost.evaluate(sweep.forward(phases), slope);
      sweep.backward(slope, gradient);
      return value;
    },
    start: kicked,
    options: { ...DEFAULTS, ...options, box: limits.box },
    finish: ({ point, iterations, evaluations, gradientNorm, stopped }) => {
      // Where nothing depends on a phase the search has not moved it.
      const moved = point.map((phase, k) => (phase === kicked[k] ? begin.phases[k]! : phase));
      const found = judge(limits.bringIn(moved), sweep, cost, slope);
      // Turns cost a rounding; where nothing was won, not even that may be lost. Nor may the power distance rise
      // where only its smooth form has fallen.
      const farther = description.figure === 'powerDistance' && found.figure > begin.figure;
      const best = found.cost <= begin.cost && !farther ? found : begin;
      return {
        settings: settingsFromPhases(chip, best.phases),
        costBefore: begin.cost,
        cost: best.cost,
        figureBefore: begin.figure,
        figure: best.figure,
        iterations,
        evaluations,
        gradientNorm,
        stopped,
      };
    },
  };
}

interface Judged {
  readonly phases: Float64Array;
  readonly cost: number;
  readonly figure: number;
}

function judge(phases: Float64Array, sweep: FieldSweep, cost: Cost, slope: ComplexMatrix): Judged {
  const achieved = sweep.forward(phases);
  return { phases, cost: cost.evaluate(achieved, slope), figure: cost.figure(achieved) };
}

function bestStart(
  starts: readonly Float64Array[],
  sweep: FieldSweep,
  cost: Cost,
  slope: ComplexMatrix,
): Judged {
  const judged = starts.map((phases) => judge(phases, sweep, cost, slope));
  if (judged.length === 0) throw new RangeError('a refinement needs settings to start from');
  return judged.reduce((best, one) => (one.cost < best.cost ? one : best));
}

/** Costs below this are rounding; there is nothing left to refine. */
const NO_COST = 1e-20;
/** Most that a phase is kicked by, as a standard deviation in radians. */
const MOST_KICK = 1e-2;

/**
 * The phases a little beside those of the start, always the same way. Cells that are out of reach may leave the
 * start at a saddle point, for permutations at a whole set of them, where the gradient vanishes by symmetry
 * although there are better phases nearby. Independent errors s of all phases cost (N - 1) s^2 (conventions,
 * section 7); s is chosen to cost about a hundredth of what the start does.
 */
function kick({ phases, cost }: Judged, modes: number): Float64Array {
  if (!(cost > NO_COST)) return phases.slice();
  const deviation = Math.min(MOST_KICK, Math.sqrt(cost / (100 * modes)));
  const random = randomStream(0, STREAMS.refinementKick);
  return phases.map((phase) => phase + deviation * random.normal());
}

/** What the phases of a chip's shifters may be. */
interface PhaseLimits {
  /** Limits during the search: none for a shifter that reaches a whole turn. */
  readonly box: Box;
  /** The same light by phases in range, or else the nearest end; held shifters at their phases. */
  bringIn(phases: Float64Array): Float64Array;
}

function limitsOfShifters(chip: Chip, held: readonly HeldShifter[]): PhaseLimits {
  const shifters = listShifters(chip);
  const low = new Float64Array(shifters.length).fill(-Infinity);
  const high = new Float64Array(shifters.length).fill(Infinity);
  const ranges: (PhaseRange | null)[] = [];
  const turns = new Float64Array(shifters.length);
  for (const { index, role } of shifters) {
    const range = chip.shifterRanges.get(index) ?? chip.shifterRange;
    ranges.push(range);
    turns[index] = (role === 'internal' && chip.style.internal === 'differential' ? 4 : 2) * Math.PI;
    if (range !== null && range[1] - range[0] < turns[index]) [low[index], high[index]] = range;
  }
  for (const { shifterIndex, phaseRad } of held) {
    if (ranges[shifterIndex] === undefined || !Number.isFinite(phaseRad)) {
      throw new RangeError(`shifter index ${shifterIndex} cannot be held at ${phaseRad}`);
    }
    ranges[shifterIndex] = [phaseRad, phaseRad];
    low[shifterIndex] = high[shifterIndex] = phaseRad;
  }
  const bringIn = (phase: number, index: number): number => {
    const range = ranges[index]!;
    const turn = turns[index]!;
    if (range === null) return withinTurn(phase, turn);
    const turned = turnIntoRange(phase, range, turn);
    return Number.isNaN(turned) ? Math.min(Math.max(phase, range[0]), range[1]) : turned;
  };
  return { box: { low, high }, bringIn: (phases) => phases.map(bringIn) };
}

/** The angle in [0, turn). */
function withinTurn(angle: number, turn: number): number {
  const within = angle - turn * Math.floor(angle / turn);
  return within < turn ? within : 0;
}

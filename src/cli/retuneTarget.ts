import type { Chip, PhaseRange } from '../chip/Chip.js';
import type { Settings } from '../chip/Settings.js';
import type { StuckShifter } from '../chip/stuckShifters.js';
import { stuckShifters, withoutStuckShifters } from '../chip/stuckShifters.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { takeColumns } from '../matrix/takeColumns.js';
import type { CostDescription } from '../merit/createCost.js';
import { createCost } from '../merit/createCost.js';
import type { Merit } from '../merit/merit.js';
import { figuresOfMerit } from '../merit/merit.js';
import { freePorts } from '../merit/portPhaseFree.js';
import type { MinimisationProgress } from '../optimise/minimise.js';
import type { OutOfRange, OutOfReach } from '../program/carryingSweep.js';
import type { CellMargin } from '../program/cellMargins.js';
import { cellMargins } from '../program/cellMargins.js';
import { principalSettings } from '../program/principalSettings.js';
import { programChip } from '../program/programChip.js';
import type { PortAssignment } from '../program/reassignPorts.js';
import { reassignPorts, sameAssignment } from '../program/reassignPorts.js';
import { randomSettings } from '../program/randomSettings.js';
import type { RefinedSettings, RefineOptions } from '../program/refineSettings.js';
import { refineInterruptibly } from '../program/refineSettings.js';
import type { DirectRetuning, Retuning } from '../program/retunings.js';
import { simulate } from '../simulate/simulate.js';
import type { RetuneOptions } from './retuneOptions.js';

/** Figures of merit of the phases that a retuning finds. */
export interface MeritOfRetuning {
  readonly retune: Retuning;
  readonly merit: Merit;
}

/** The phases found for a target, and all that there is to say of how they were found. */
export interface RetunedTarget {
  readonly settings: Settings;
  /** What the chip then does. */
  readonly achieved: ComplexMatrix;
  readonly merit: Merit;
  /** Cells that cannot do, one by one, what the target asks of them. */
  readonly outOfReach: readonly OutOfReach[];
  readonly outOfRange: readonly OutOfRange[];
  /** For every cell what the target asks of it, against its reach. */
  readonly margins: readonly CellMargin[];
  /** The retuning asked for, and the lesser ones for comparison, from the least on. */
  readonly retunings: readonly MeritOfRetuning[];
  readonly refinement: RefinedSettings | null;
  readonly refined: CostDescription | null;
  /** Starts that the refinement went from. */
  readonly starts: number;
  /** What the refinement, or else the figure by which the chip is judged, would come to if none were stuck. */
  readonly figureWithoutStuck: number | null;
  readonly stuck: readonly StuckShifter[];
  /** What the chip would do if no shifter were stuck; null when none is. */
  readonly meritWithoutStuck: Merit | null;
}

/** What a search is watched and ended by. */
export interface SearchControl {
  readonly signal: AbortSignal;
  readonly onProgress: (progress: MinimisationProgress) => void;
}

/** The target with its ports exchanged where the chip then does better, as --reassign-ports asks. */
export interface ReassignedTarget {
  readonly matrix: ComplexMatrix;
  readonly assignment: PortAssignment;
  /** The judged figure before and after the exchange; null when none was asked for. */
  readonly gain: { readonly before: number; readonly after: number } | null;
}

/**
 * Exchanges ports. The judge is what the chip does of the figure that matters, programmed without a search:
 * a refinement for each exchange would take hours.
 */
export function reassignTarget(
  chip: Chip,
  matrix: ComplexMatrix,
  options: RetuneOptions,
  signal: AbortSignal,
): ReassignedTarget {
  const same = sameAssignment(chip.mesh.modes);
  if (options.reassignPorts === undefined) return { matrix, assignment: same, gain: null };
  const retune = options.retune === 'refine' ? 'mesh' : options.retune;
  const judge = (target: ComplexMatrix, assignment: PortAssignment): number => {
    const description = costDescription(chip, options, assignment);
    const cost = createCost(target, description);
    const achieved = simulate(chip, programChip(chip, target, retune).program.settings);
    const figure = cost.figure(takeColumns(achieved, cost.inputs));
    return description.figure === 'powerDistance' ? -figure : figure;
  };
  const found = reassignPorts(matrix, options.reassignPorts, judge, { enough: () => signal.aborted });
  const sign = options.refineFor === 'powerDistance' ? -1 : 1;
  return {
    matrix: found.target,
    assignment: found.assignment,
    gain: { before: sign * found.before, after: sign * found.after },
  };
}

/** Finds the phases of a target that stands as the chip's ports see it. */
export async function retuneTarget(
  chip: Chip,
  target: ComplexMatrix,
  assignment: PortAssignment,
  options: RetuneOptions,
  control: SearchControl,
): Promise<RetunedTarget> {
  const { retune } = options;
  const found = await programsOf(chip, target, assignment, options, control);
  const stuck = stuckShifters(chip);
  const working = stuck.length === 0 ? null : withoutStuckShifters(chip);
  const without = working && (await programsOf(working, target, assignment, options, control));
  const achieved = simulate(chip, found.settings);
  const free = freePorts(chip);
  const meritOf = (settings: Settings): Merit => figuresOfMerit(target, simulate(chip, settings), free);
  const merit = figuresOfMerit(target, achieved, free);
  const meritWithoutStuck =
    working && without && figuresOfMerit(target, simulate(working, without.settings), free);
  return {
    ...found,
    achieved,
    merit,
    retunings: [
      ...found.lesser.map(([name, settings]) => ({ retune: name, merit: meritOf(settings) })),
      { retune, merit },
    ],
    stuck,
    meritWithoutStuck,
    figureWithoutStuck:
      meritWithoutStuck && (without?.refinement?.figure ?? meritWithoutStuck[judgedKey(chip)]),
  };
}

interface Programs extends Pick<
  RetunedTarget,
  'settings' | 'outOfReach' | 'outOfRange' | 'margins' | 'refinement' | 'refined' | 'starts'
> {
  readonly lesser: readonly (readonly [DirectRetuning, Settings])[];
}

async function programsOf(
  chip: Chip,
  target: ComplexMatrix,
  assignment: PortAssignment,
  options: RetuneOptions,
  { signal, onProgress }: SearchControl,
): Promise<Programs> {
  const { retune } = options;
  const cell = programChip(chip, target, 'cell');
  const none = cell.uncorrected ?? cell.program;
  // What the target asks of the cells one by one, whatever is then made of it.
  const { outOfReach } = cell.program;
  const margins = cellMargins(chip, cell.program);
  const direct = { refinement: null, refined: null, starts: 0, outOfReach, margins };
  if (retune === 'none') {
    return { ...direct, settings: none.settings, outOfRange: none.outOfRange, lesser: [] };
  }
  const isIdeal = cell.uncorrected === null;
  const lesser: [DirectRetuning, Settings][] = isIdeal ? [] : [['none', none.settings]];
  if (retune === 'cell') {
    return { ...direct, settings: cell.program.settings, outOfRange: cell.program.outOfRange, lesser };
  }
  const mesh = programChip(chip, target, 'mesh').program;
  lesser.push(['cell', cell.program.settings]);
  if (retune === 'mesh') {
    return { ...direct, settings: mesh.settings, outOfRange: mesh.outOfRange, lesser };
  }
  lesser.push(['mesh', mesh.settings]);
  const refined = costDescription(chip, options, assignment);
  const starts = lesser.map(([, settings]) => settings);
  const limits = (spent: number): RefineOptions => ({
    signal,
    onProgress,
    ...(options.refineSeconds === undefined
      ? {}
      : { mostSeconds: Math.max(options.refineSeconds - spent, LEAST_SECONDS) }),
    ...(options.refineIterations === undefined ? {} : { mostIterations: options.refineIterations }),
  });
  const began = performance.now();
  let refinement = await refineInterruptibly(chip, target, starts, refined, limits(0));
  const { figureBefore } = refinement;
  let tried = 1;
  for (; tried <= moreStarts(chip) && !isOver(refinement, options, began); tried++) {
    const start = [randomSettings(chip, tried - 1)];
    const spent = (performance.now() - began) / 1000;
    const other = await refineInterruptibly(chip, target, start, refined, limits(spent));
    if (other.cost < refinement.cost) refinement = { ...other, figureBefore };
    if (other.stopped === 'interrupted' || other.stopped === 'time') {
      refinement = { ...refinement, stopped: other.stopped };
    }
  }
  const settings = calmer(chip, target, refinement, refined);
  return { settings, outOfRange: [], outOfReach, margins, lesser, refinement, refined, starts: tried };
}

/** Time left for a start when the time granted is over: enough to look at it once. */
const LEAST_SECONDS = 1e-3;
/** Random starts besides the programmed ones, and the largest chip that is worth them by default. */
const MORE_STARTS = 4;
const LARGEST_FOR_MORE_STARTS = 24;

/**
 * Chips whose shifters are limited or stuck have poor local minima near their programmed phases; a few starts
 * elsewhere find better ones. On others the programmed phases are as good as any start.
 */
function moreStarts({ mesh, shifterRange, shifterRanges }: Chip): number {
  const isLimited = isShort(shifterRange) || Array.from(shifterRanges.values()).some(isShort);
  return isLimited && mesh.modes <= LARGEST_FOR_MORE_STARTS ? MORE_STARTS : 0;
}

function isShort(range: PhaseRange | null): boolean {
  return range !== null && range[1] - range[0] < 2 * Math.PI;
}

function isOver({ stopped }: RefinedSettings, { refineSeconds }: RetuneOptions, began: number): boolean {
  if (stopped === 'interrupted' || stopped === 'time') return true;
  return refineSeconds !== undefined && performance.now() - began > 1000 * refineSeconds;
}

/** The figure of merit by which a chip is judged. */
export function judgedKey(chip: Chip): 'fidelity' | 'portPhaseFreeFidelity' {
  return chip.portShifters ? 'fidelity' : 'portPhaseFreeFidelity';
}

/** Figures that differ by no more are the same to rounding. */
const SAME_FIGURE = 1e-12;

/** The refined phases as a plain program would have them, where that changes nothing but rounding. */
function calmer(
  chip: Chip,
  target: ComplexMatrix,
  { settings, figureBefore }: RefinedSettings,
  description: CostDescription,
): Settings {
  const cost = createCost(target, description);
  const figureOf = (one: Settings): number => cost.figure(takeColumns(simulate(chip, one), cost.inputs));
  const principal = principalSettings(chip, settings);
  const figure = figureOf(principal);
  const isSame = Math.abs(figure - figureOf(settings)) <= SAME_FIGURE;
  // What a refinement began with is never given up, not even by a rounding.
  const isWorse = description.figure === 'powerDistance' ? figure > figureBefore : figure < figureBefore;
  return isSame && !isWorse ? principal : settings;
}

/** What is refined: the figure asked for, on the chip's ports that stand for those chosen of the target. */
function costDescription(
  chip: Chip,
  { refineFor, inputs, outputs }: RetuneOptions,
  assignment: PortAssignment,
): CostDescription {
  const figure = refineFor ?? judgedKey(chip);
  return {
    figure,
    freePorts: freePorts(chip),
    ...(inputs ? { inputs: inputs.map((port) => assignment.inputs[port]!) } : {}),
    ...(outputs ? { outputs: outputs.map((port) => assignment.outputs[port]!) } : {}),
  };
}

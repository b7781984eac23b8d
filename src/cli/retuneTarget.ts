import type { Chip } from '../chip/Chip.js';
import type { Settings } from '../chip/Settings.js';
import type { StuckShifter } from '../chip/stuckShifters.js';
import { stuckShifters, withoutStuckShifters } from '../chip/stuckShifters.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { takeColumns } from '../matrix/takeColumns.js';
import type { CostDescription } from '../merit/createCost.js';
import { createCost } from '../merit/createCost.js';
import type { Merit } from '../merit/merit.js';
import { figuresOfMerit } from '../merit/merit.js';
import { judgedFigure } from '../merit/judgedFidelity.js';
import { freePorts } from '../merit/portPhaseFree.js';
import type { MinimisationProgress } from '../optimise/minimise.js';
import type { OutOfRange, OutOfReach } from '../program/carryingSweep.js';
import type { CellMargin } from '../program/cellMargins.js';
import { cellMargins } from '../program/cellMargins.js';
import { programChip } from '../program/programChip.js';
import type { PortAssignment } from '../program/reassignPorts.js';
import { reassignPorts, sameAssignment } from '../program/reassignPorts.js';
import type { ThoroughlyRefined } from '../program/refineThoroughly.js';
import { refineThoroughly } from '../program/refineThoroughly.js';
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
  readonly refinement: ThoroughlyRefined | null;
  readonly refined: CostDescription | null;
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
      meritWithoutStuck && (without?.refinement?.figure ?? meritWithoutStuck[judgedFigure(chip)]),
  };
}

interface Programs extends Pick<
  RetunedTarget,
  'settings' | 'outOfReach' | 'outOfRange' | 'margins' | 'refinement' | 'refined'
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
  const direct = { refinement: null, refined: null, outOfReach, margins };
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
  const refinement = await refineThoroughly(chip, target, starts, refined, {
    signal,
    onProgress,
    ...(options.refineSeconds === undefined ? {} : { mostSeconds: options.refineSeconds }),
    ...(options.refineIterations === undefined ? {} : { mostIterations: options.refineIterations }),
  });
  return { ...direct, settings: refinement.settings, outOfRange: [], lesser, refinement, refined };
}

/** What is refined: the figure asked for, on the chip's ports that stand for those chosen of the target. */
function costDescription(
  chip: Chip,
  { refineFor, inputs, outputs }: RetuneOptions,
  assignment: PortAssignment,
): CostDescription {
  const figure = refineFor ?? judgedFigure(chip);
  return {
    figure,
    freePorts: freePorts(chip),
    ...(inputs ? { inputs: inputs.map((port) => assignment.inputs[port]!) } : {}),
    ...(outputs ? { outputs: outputs.map((port) => assignment.outputs[port]!) } : {}),
  };
}

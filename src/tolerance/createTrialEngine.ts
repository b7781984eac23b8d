import { splitterCount } from '../chip/cellSplitters.js';
import type { Chip, ExternalGuide, InternalArm, PhaseRange } from '../chip/Chip.js';
import { EXTERNAL_GUIDES, externalAtOutput, INTERNAL_ARMS } from '../chip/Chip.js';
import type { Settings } from '../chip/Settings.js';
import type { Decomposition } from '../decompose/Decomposition.js';
import { decompose } from '../decompose/decompose.js';
import type { KernelInstance } from '../kernel/loadKernels.js';
import { loadKernels } from '../kernel/loadKernels.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { haarFromStream } from '../matrix/haar.js';
import { figuresOfMerit } from '../merit/merit.js';
import { freePorts } from '../merit/portPhaseFree.js';
import { carryingSweep } from '../program/carryingSweep.js';
import { randomStream } from '../random/RandomStream.js';
import { STREAMS } from '../random/streams.js';
import { simulate } from '../simulate/simulate.js';
import { createErrorDraw } from './createErrorDraw.js';
import { createTrialRetuner } from './createTrialRetuner.js';
import { FAST_FIGURES, fastFigure } from './fastFigures.js';
import { createQuantiser } from './quantise.js';
import { reserveTrialMemory, writeTarget } from './trialMemory.js';
import type { TrialPlan } from './TrialPlan.js';
import type { Lane } from './trialViews.js';
import {
  ALL_LANES,
  portAmplitudes,
  readSettings,
  takeViews,
  writeFactors,
  writeSettings,
} from './trialViews.js';

/** One sampled chip, whole: what a trial was judged on. */
export interface SampledChip {
  /** The chip with its own ratios and losses. */
  readonly chip: Chip;
  /** The phases as they really are: programmed, quantised and with their errors. */
  readonly settings: Settings;
  readonly target: ComplexMatrix;
}

/** Runs trials. Holds a kernel memory of its own: one engine for each worker. */
export interface TrialEngine {
  /**
   * Runs trials `first` to `first + count - 1` (indices from 0) and writes one row of judged figures each.
   * @returns how many coupling ratios were clamped to [0, 1]
   */
  run(first: number, count: number, rows: Float64Array): number;
  /** How many trials of the last run had their refinement ended by the clock. */
  readonly outOfTime: () => number;
  /** The chip of one trial (index from 0), in full. */
  sample(trial: number): SampledChip;
}

/**
 * Makes an engine for a plan. A trial depends on the plan and its own number alone: not on which trials are
 * run with it, in which order or on which worker.
 * @param instance kernels to use; tests put the plain twins here
 */
export function createTrialEngine(plan: TrialPlan, instance: KernelInstance = loadKernels()): TrialEngine {
  const { chip, errors, retune, figures } = plan;
  const { modes, cells, columns } = chip.mesh;
  const { kernels } = instance;
  const memory = reserveTrialMemory(instance, chip, errors.correlationLength > 0);
  const views = takeViews(instance, memory, chip);
  const draw = createErrorDraw(plan, instance, memory, views);
  const atOutput = externalAtOutput(chip.style);
  const style = {
    place: EXTERNAL_GUIDES.indexOf(chip.style.external satisfies ExternalGuide),
    arm: INTERNAL_ARMS.indexOf(chip.style.internal satisfies InternalArm),
    onLower: chip.style.external.startsWith('lower') ? 1 : 0,
    realSplitters: chip.style.splitterForm === 'real' ? 1 : 0,
    splitters: chip.style.splitters,
  };
  const quantise = errors.bits > 0 ? createQuantiser(chip, errors.bits) : (settings: Settings) => settings;
  // The solving kernel knows cells of two splitters; others are solved by the readable sweep.
  const plainCells = chip.style.splitters === 2 && rangesNeverBind(chip);
  const solvedByKernel = retune === 'cell' && errors.bits === 0 && plainCells;
  const free = freePorts(chip);
  const fast = figures.every(
    (key) => FAST_FIGURES.has(key) && (key !== 'portPhaseFreeFidelity' || free === 'output'),
  );
  const retuner = retune === 'mesh' || retune === 'refine' ? createTrialRetuner(plan) : null;
  const shifterAmplitudes = portAmplitudes(chip, atOutput);
  const targets: ComplexMatrix[] = [];
  const factors: Decomposition[] = [];
  /** Arms, external and port factors of phases that were programmed once; errors are put onto copies. */
  let programmedOnce: readonly Float64Array[] | null = null;
  let outOfTime = 0;

  for (const lane of ALL_LANES) if (plan.target !== 'haar') setTarget(lane, plan.target);
  if (plan.target !== 'haar' && retune === 'none') {
    for (const lane of ALL_LANES) programLane(lane, chip.couplingRatios);
    programmedOnce = views.phases.map((view) => view.slice());
  }

  function setTarget(lane: Lane, target: ComplexMatrix): void {
    targets[lane] = target;
    factors[lane] = lane === 1 && targets[0] === target ? factors[0]! : decompose(target, chip.mesh);
    writeTarget(instance, memory.targets[lane], target);
    if (solvedByKernel) writeFactors(views, lane, factors[lane], atOutput);
  }

  /** Programs one lane by the readable sweep, ranges and resolution included. */
  function programLane(lane: Lane, ratios: Float64Array): void {
    const { settings } = carryingSweep(chip, factors[lane]!, ratios);
    writeSettings(views, chip, lane, quantise(settings));
  }

  /** The same by the retunings that look at the whole mesh. */
  function retuneLane(lane: Lane, retuned: NonNullable<typeof retuner>): void {
    const found = retuned(sampledChip(lane), targets[lane]!, factors[lane]!);
    if (found.outOfTime) outOfTime++;
    writeSettings(views, chip, lane, quantise(found.settings));
  }

  /** Puts phases into the lanes: those programmed once, or new ones for these splitters or targets. */
  function setPhases(lanes: readonly Lane[]): void {
    if (programmedOnce) {
      if (errors.phaseSigma > 0) views.phases.forEach((view, k) => view.set(programmedOnce[k]!));
    } else if (solvedByKernel) {
      solveByKernel();
    } else {
      for (const lane of lanes) {
        if (retuner) retuneLane(lane, retuner);
        else programLane(lane, retune === 'none' ? chip.couplingRatios : ratiosOfLane(lane));
      }
    }
  }

  function solveByKernel(): void {
    kernels.solveCells(
      cells,
      modes,
      memory.upperPort,
      memory.ratios,
      memory.wanted,
      memory.diagonal,
      memory.diagonalAt,
      memory.carried,
      memory.block,
      memory.arms,
      memory.external,
      style.arm,
      style.onLower,
      atOutput ? 1 : 0,
      style.realSplitters,
      chip.loss.shifter,
    );
    if (!chip.portShifters) return;
    const ports = atOutput ? views.input : views.output;
    for (let k = 0; k < ports.length; k++) ports[k] = shifterAmplitudes[k >> 2]! * views.carried[k]!;
  }

  /**
   * Prepares two trials up to the coefficients of their cells.
   * @param lanes those whose phases are wanted; to find the others' may be left out
   */
  function prepare(first: number, lanes: readonly Lane[]): void {
    if (plan.target === 'haar') {
      for (const lane of ALL_LANES) {
        setTarget(lane, haarFromStream(modes, randomStream(plan.seed, STREAMS.trialTarget, first + lane)));
      }
    }
    draw.drawRatios(first);
    setPhases(lanes);
    draw.addPhaseErrors(first);
  }

  function ratiosOfLane(lane: Lane): Float64Array {
    return Float64Array.from({ length: splitterCount(chip) }, (_, k) => views.ratios[2 * k + lane]!);
  }

  function sampledChip(lane: Lane): Chip {
    const cellLoss =
      errors.lossSigmaDb > 0
        ? Float64Array.from({ length: cells }, (_, k) => views.gain[2 * k + lane]!)
        : chip.cellLoss;
    return { ...chip, couplingRatios: ratiosOfLane(lane), cellLoss };
  }

  function sampleLane(lane: Lane): SampledChip {
    return {
      chip: sampledChip(lane),
      settings: readSettings(views, chip, lane),
      target: targets[lane]!,
    };
  }

  function judgeLane(lane: Lane, rows: Float64Array, at: number): void {
    if (!fast) {
      const sampled = sampleLane(lane);
      const merit = figuresOfMerit(sampled.target, simulate(sampled.chip, sampled.settings), free);
      figures.forEach((key, k) => (rows[at + k] = merit[key]));
      return;
    }
    kernels.judgeTrial(
      modes,
      columns,
      lane,
      memory.ranges,
      memory.upperPort,
      memory.coefficients,
      memory.panel,
      memory.targets[lane],
      memory.sums,
      memory.factors,
      memory.output,
      memory.result,
    );
    const { result } = views;
    const overlapSquare = result[lane]! ** 2 + result[2 + lane]! ** 2;
    const power = result[4 + lane]!;
    for (let k = 0; k < figures.length; k++) {
      rows[at + k] = fastFigure(figures[k]!, modes, overlapSquare, power, result[6 + lane]!);
    }
  }

  return {
    run: (first, count, rows) => {
      views.clampedCounts.fill(0);
      outOfTime = 0;
      for (let done = 0; done < count; done += 2) {
        // Both lanes are always at work; what the second one does behind the last trial is dropped, clamped
        // ratios included.
        const clampedBefore = views.clampedCounts[2]!;
        prepare(first + done, done + 1 === count ? [0] : ALL_LANES);
        if (done + 1 === count) views.clampedCounts[2] = clampedBefore;
        if (fast) {
          kernels.composeCells(
            cells,
            memory.upperPort,
            memory.ratios,
            memory.arms,
            memory.external,
            memory.gain,
            modes,
            views.inputAddress,
            memory.factors,
            memory.block,
            memory.coefficients,
            style.place,
            style.realSplitters,
            style.splitters,
          );
        }
        for (const lane of ALL_LANES) {
          if (done + lane < count) judgeLane(lane, rows, (done + lane) * figures.length);
        }
      }
      return views.clampedCounts[0]! + views.clampedCounts[2]!;
    },
    outOfTime: () => outOfTime,
    sample: (trial) => {
      prepare(trial, [0]);
      return sampleLane(0);
    },
  };
}

/** True when every shifter can be set to any phase that the plain sweep asks for. */
function rangesNeverBind(chip: Chip): boolean {
  const wide = (range: PhaseRange | null): boolean =>
    range === null || (range[0] <= 0 && range[1] >= 2 * Math.PI);
  return wide(chip.shifterRange) && Array.from(chip.shifterRanges.values()).every(wide);
}

import type { Chip, ExternalGuide, InternalArm, PhaseRange } from '../chip/Chip.js';
import { EXTERNAL_GUIDES, externalAtOutput, INTERNAL_ARMS } from '../chip/Chip.js';
import type { Settings } from '../chip/Settings.js';
import { zeroSettings } from '../chip/shifters.js';
import type { Decomposition } from '../decompose/Decomposition.js';
import { decompose } from '../decompose/decompose.js';
import type { KernelInstance } from '../kernel/loadKernels.js';
import { loadKernels } from '../kernel/loadKernels.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { haarFromStream } from '../matrix/haar.js';
import type { Merit } from '../merit/merit.js';
import { figuresOfMerit } from '../merit/merit.js';
import { freePorts } from '../merit/portPhaseFree.js';
import { carryingSweep } from '../program/carryingSweep.js';
import { randomStream } from '../random/RandomStream.js';
import { STREAMS } from '../random/streams.js';
import { simulate } from '../simulate/simulate.js';
import { amplitudeFromLossDb, decibelFromPowerRatio } from '../units/decibel.js';
import { createQuantiser } from './quantise.js';
import type { TrialMemory } from './trialMemory.js';
import { reserveTrialMemory, writeTarget } from './trialMemory.js';
import type { TrialPlan } from './TrialPlan.js';

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
  /** The chip of one trial (index from 0), in full. */
  sample(trial: number): SampledChip;
}

const WORD = 2 ** 32;
const ALL_LANES = [0, 1] as const;
type Lane = (typeof ALL_LANES)[number];

/** Figures that follow from the trace, the power and the port overlaps; for all others V itself is needed. */
const FAST_FIGURES: ReadonlySet<keyof Merit> = new Set<keyof Merit>([
  'fidelity',
  'averageGateFidelity',
  'portPhaseFreeFidelity',
  'rmsError',
  'transmission',
  'transmissionDb',
]);

/**
 * Makes an engine for a plan. A trial depends on the plan and its own number alone: not on which trials are run with it, in which order
 * or on which worker.
 *
 * Each source of errors has a stream of random numbers of its own, so that one source can be switched without another one's numbers changing.
 * @param instance kernels to use; tests put the plain twins here
 */
export function createTrialEngine(plan: TrialPlan, instance: KernelInstance = loadKernels()): TrialEngine {
  const { chip, errors, retune, figures } = plan;
  const { modes, cells, columns } = chip.mesh;
  const { kernels } = instance;
  const memory = reserveTrialMemory(instance, chip, errors.correlationLength > 0);
  const views = takeViews(instance, memory, chip);
  const atOutput = externalAtOutput(chip.style);
  const style = {
    place: EXTERNAL_GUIDES.indexOf(chip.style.external satisfies ExternalGuide),
    arm: INTERNAL_ARMS.indexOf(chip.style.internal satisfies InternalArm),
    onLower: chip.style.external.startsWith('lower') ? 1 : 0,
    realSplitters: chip.style.splitterForm === 'real' ? 1 : 0,
  };
  const quantise = errors.bits > 0 ? createQuantiser(chip, errors.bits) : (settings: Settings) => settings;
  const solvedByKernel = retune === 'cell' && errors.bits === 0 && rangesNeverBind(chip);
  const free = freePorts(chip);
  const fast = figures.every(
    (key) => FAST_FIGURES.has(key) && (key !== 'portPhaseFreeFidelity' || free === 'output'),
  );
  const shifterAmplitudes = portAmplitudes(chip, atOutput);
  const targets: ComplexMatrix[] = [];
  const factors: Decomposition[] = [];
  /** Arms, external and port factors of phases that were programmed once; errors are put onto copies. */
  let programmedOnce: readonly Float64Array[] | null = null;

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

  function fill(address: number, count: number, stream: number, first: number): void {
    for (const lane of ALL_LANES) {
      kernels.seedTrial(
        memory.state,
        lane,
        plan.seed % WORD,
        Math.floor(plan.seed / WORD),
        stream,
        first + lane,
      );
    }
    fillMore(address, count);
  }

  function fillMore(address: number, count: number): void {
    if (errors.distribution === 'uniform') kernels.fillUniforms(address, count, memory.state);
    else kernels.fillNormals(address, count + (count % 2), memory.state);
  }

  /** Two numbers a cell with the correlations of the process, at `memory.numbers`. */
  function fillLocalField(stream: number, first: number): void {
    if (errors.correlationLength > 0) {
      const columnStep = Math.exp(-1 / errors.correlationLength);
      // Two ports make the height of a cell.
      const portStep = Math.exp(-1 / (2 * errors.correlationLength));
      fill(memory.grid, columns * modes, stream, first);
      kernels.correlateGrid(memory.grid, columns, modes, columnStep, portStep);
      kernels.pickPlaces(memory.numbers, 32, memory.grid, memory.places, cells);
      fillMore(memory.grid, columns * modes);
      kernels.correlateGrid(memory.grid, columns, modes, columnStep, portStep);
      kernels.pickPlaces(memory.numbers + 16, 32, memory.grid, memory.places, cells);
    } else {
      fill(memory.numbers, 2 * cells, stream, first);
    }
    if (errors.pairCorrelation !== 0) kernels.correlatePairs(memory.numbers, cells, errors.pairCorrelation);
  }

  /** Draws the splitters of two trials, losses included. */
  function drawSplitters(first: number): void {
    views.shift.fill(errors.bias);
    if (errors.biasSigma > 0) {
      fill(memory.numbers, 2, STREAMS.dieBias, first);
      for (const lane of ALL_LANES) views.shift[lane]! += errors.biasSigma * views.numbers[lane]!;
    }
    if (errors.sigma > 0) fillLocalField(STREAMS.splitterRatios, first);
    else views.numbers.fill(0);
    kernels.drawSplitters(
      memory.splitters,
      2 * cells,
      memory.nominal,
      memory.numbers,
      errors.sigma,
      memory.shift,
      memory.clamped,
    );
    if (errors.sigmaAngle > 0) {
      fillLocalField(STREAMS.splitterAngles, first);
      kernels.turnSplitters(memory.splitters, 2 * cells, memory.numbers, errors.sigmaAngle);
    }
    if (errors.lossSigmaDb > 0) {
      fill(memory.numbers, 2 * cells, STREAMS.splitterLosses, first);
      drawLosses();
    }
  }

  function drawLosses(): void {
    const { loss, cellLoss } = chip;
    for (let cell = 0; cell < cells; cell++) {
      const nominal = cellLoss ? cellLoss[cell]! : loss.splitter ** 2;
      const eachDb = -decibelFromPowerRatio(nominal ** 2) / 2;
      for (const lane of ALL_LANES) {
        const [one, two] = [0, 2].map((k) =>
          Math.max(0, eachDb + errors.lossSigmaDb * views.numbers[4 * cell + k + lane]!),
        );
        views.gain[2 * cell + lane] = amplitudeFromLossDb(one! + two!);
      }
    }
  }

  /** Puts phases into both lanes: those programmed once, or new ones for these splitters or targets. */
  function setPhases(): void {
    if (programmedOnce) {
      if (errors.phaseSigma > 0) views.phases.forEach((view, k) => view.set(programmedOnce[k]!));
    } else if (solvedByKernel) {
      solveByKernel();
    } else {
      for (const lane of ALL_LANES) {
        programLane(lane, retune === 'none' ? chip.couplingRatios : ratiosOfLane(lane));
      }
    }
  }

  function solveByKernel(): void {
    kernels.solveCells(
      cells,
      modes,
      memory.upperPort,
      memory.splitters,
      memory.wanted,
      memory.diagonal,
      memory.diagonalAt,
      memory.carried,
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

  function addPhaseErrors(first: number): void {
    if (errors.phaseSigma === 0) return;
    const { numbers, arms, external } = memory;
    const sigma = errors.phaseSigma;
    fill(numbers, cells, STREAMS.phaseErrors, first);
    if (chip.style.internal === 'differential') {
      kernels.turnFactors(arms, 64, cells, numbers, sigma / 2);
      kernels.turnFactors(arms + 32, 64, cells, numbers, -sigma / 2);
    } else {
      kernels.turnFactors(chip.style.internal === 'lower' ? arms + 32 : arms, 64, cells, numbers, sigma);
    }
    fillMore(numbers, cells);
    kernels.turnFactors(external, 32, cells, numbers, sigma);
    if (chip.portShifters) {
      fillMore(numbers, modes);
      const ports = atOutput ? views.inputAddress : memory.output;
      kernels.turnFactors(ports, 32, modes, numbers, sigma);
    }
  }

  /** Prepares two trials up to the coefficients of their cells. */
  function prepare(first: number): void {
    if (plan.target === 'haar') {
      for (const lane of ALL_LANES) {
        setTarget(lane, haarFromStream(modes, randomStream(plan.seed, STREAMS.trialTarget, first + lane)));
      }
    }
    drawSplitters(first);
    setPhases();
    addPhaseErrors(first);
  }

  function ratiosOfLane(lane: Lane): Float64Array {
    return Float64Array.from({ length: 2 * cells }, (_, k) =>
      Math.min(1, views.splitters[4 * k + 2 + lane]! ** 2),
    );
  }

  function sampleLane(lane: Lane): SampledChip {
    const cellLoss =
      errors.lossSigmaDb > 0
        ? Float64Array.from({ length: cells }, (_, k) => views.gain[2 * k + lane]!)
        : chip.cellLoss;
    return {
      chip: { ...chip, couplingRatios: ratiosOfLane(lane), cellLoss },
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
      for (let done = 0; done < count; done += 2) {
        // Both lanes are always at work; what the second one does behind the last trial is dropped, clamped ratios included.
        const clampedBefore = views.clampedCounts[2]!;
        prepare(first + done);
        if (done + 1 === count) views.clampedCounts[2] = clampedBefore;
        if (fast) {
          views.factors.set(views.input);
          kernels.composeCells(
            cells,
            memory.upperPort,
            memory.splitters,
            memory.arms,
            memory.external,
            memory.gain,
            memory.factors,
            memory.coefficients,
            style.place,
            style.realSplitters,
          );
        }
        for (const lane of ALL_LANES) {
          if (done + lane < count) judgeLane(lane, rows, (done + lane) * figures.length);
        }
      }
      return views.clampedCounts[0]! + views.clampedCounts[2]!;
    },
    sample: (trial) => {
      prepare(trial);
      return sampleLane(0);
    },
  };
}

function fastFigure(
  key: keyof Merit,
  modes: number,
  overlapSquare: number,
  power: number,
  portSum: number,
): number {
  const fidelity = power > 0 ? overlapSquare / (modes * power) : 0;
  switch (key) {
    case 'averageGateFidelity':
      return (modes * fidelity + 1) / (modes + 1);
    case 'portPhaseFreeFidelity':
      return power > 0 ? portSum ** 2 / (modes * power) : 0;
    case 'rmsError':
      return Math.sqrt(Math.max(0, (modes + power - 2 * Math.sqrt(overlapSquare)) / modes));
    case 'transmission':
      return power / modes;
    case 'transmissionDb':
      return decibelFromPowerRatio(power / modes);
    default:
      return fidelity;
  }
}

/** True when every shifter can be set to any phase that the plain sweep asks for. */
function rangesNeverBind(chip: Chip): boolean {
  const wide = (range: PhaseRange | null): boolean =>
    range === null || (range[0] <= 0 && range[1] >= 2 * Math.PI);
  return wide(chip.shifterRange) && Array.from(chip.shifterRanges.values()).every(wide);
}

/** Views of the arrays that are written and read from here. */
interface TrialViews {
  readonly shift: Float64Array;
  readonly numbers: Float64Array;
  /** Two 64-bit counts; their low words stand at 0 and 2. */
  readonly clampedCounts: Int32Array;
  readonly splitters: Float64Array;
  readonly wanted: Float64Array;
  readonly diagonal: Float64Array;
  readonly diagonalAt: Int32Array;
  readonly carried: Float64Array;
  readonly arms: Float64Array;
  readonly external: Float64Array;
  readonly gain: Float64Array;
  readonly factors: Float64Array;
  /** The fields' factors at the inputs, facets and port phases; copied to `factors` for each pair. */
  readonly input: Float64Array;
  readonly inputAddress: number;
  readonly output: Float64Array;
  readonly result: Float64Array;
  /** All that phases are written to. */
  readonly phases: readonly Float64Array[];
}

function takeViews(instance: KernelInstance, memory: TrialMemory, chip: Chip): TrialViews {
  const { modes, cells } = chip.mesh;
  const inputAddress = instance.reserve(4 * modes);
  const doubles = (address: number, length: number): Float64Array => instance.doubles(address, length);
  const arms = doubles(memory.arms, 8 * cells);
  const external = doubles(memory.external, 4 * cells);
  const input = doubles(inputAddress, 4 * modes);
  const output = doubles(memory.output, 4 * modes);
  const gain = doubles(memory.gain, 2 * cells);
  gain.forEach((_, k) => (gain[k] = chip.cellLoss ? chip.cellLoss[k >> 1]! : chip.loss.splitter ** 2));
  for (const [ports, atOutput] of [
    [input, true],
    [output, false],
  ] as const) {
    const amplitudes = portAmplitudes(chip, atOutput, false);
    for (let k = 0; k < ports.length; k++) ports[k] = k % 4 < 2 ? amplitudes[k >> 2]! : 0;
  }
  return {
    shift: doubles(memory.shift, 2),
    numbers: doubles(memory.numbers, 2 * (2 * cells + modes + 2)),
    clampedCounts: instance.integers(memory.clamped, 4),
    splitters: doubles(memory.splitters, 8 * cells),
    wanted: doubles(memory.wanted, 8 * cells),
    diagonal: doubles(memory.diagonal, 4 * modes),
    diagonalAt: instance.integers(memory.diagonalAt, modes),
    carried: doubles(memory.carried, 4 * modes),
    arms,
    external,
    gain,
    factors: doubles(memory.factors, 4 * modes),
    input,
    inputAddress,
    output,
    result: doubles(memory.result, 8),
    phases: [arms, external, input, output],
  };
}

/** Amplitude factors of the ports on one side: facets, the columns' loss (counted at the outputs), and the port shifters' where they are. */
function portAmplitudes(chip: Chip, atInput: boolean, withShifters = chip.portShifters): Float64Array {
  const { loss, mesh } = chip;
  const others = (atInput ? 1 : loss.column ** mesh.columns) * (withShifters ? loss.shifter : 1);
  return (atInput ? loss.input : loss.output).map((facet) => facet * others);
}

/** Writes settings into one lane as complex factors, the shifters' losses included. */
function writeSettings(views: TrialViews, chip: Chip, lane: Lane, settings: Settings): void {
  const { arms, external } = views;
  const { shifter } = chip.loss;
  const { internal } = chip.style;
  settings.internal.forEach((theta, cell) => {
    const at = 8 * cell + lane;
    const half = internal === 'differential';
    const angle = half ? theta / 2 : theta;
    const [turned, other] = internal === 'lower' ? [at + 4, at] : [at, at + 4];
    arms[turned] = shifter * Math.cos(angle);
    arms[turned + 2] = shifter * Math.sin(angle);
    arms[other] = half ? shifter * Math.cos(angle) : 1;
    arms[other + 2] = half ? -shifter * Math.sin(angle) : 0;
  });
  settings.external.forEach((phi, cell) => {
    external[4 * cell + lane] = shifter * Math.cos(phi);
    external[4 * cell + 2 + lane] = shifter * Math.sin(phi);
  });
  if (!settings.port) return;
  const atInput = externalAtOutput(chip.style);
  const ports = atInput ? views.input : views.output;
  const amplitudes = portAmplitudes(chip, atInput);
  settings.port.forEach((phase, port) => {
    ports[4 * port + lane] = amplitudes[port]! * Math.cos(phase);
    ports[4 * port + 2 + lane] = amplitudes[port]! * Math.sin(phase);
  });
}

/** The phases of one lane, read back from the factors. */
function readSettings(views: TrialViews, chip: Chip, lane: Lane): Settings {
  const settings = zeroSettings(chip);
  const { internal } = chip.style;
  const angleAt = (factors: Float64Array, at: number): number => {
    const angle = Math.atan2(factors[at + 2]!, factors[at]!);
    return angle < 0 ? angle + 2 * Math.PI : angle;
  };
  for (let cell = 0; cell < chip.mesh.cells; cell++) {
    const arm = 8 * cell + lane + (internal === 'lower' ? 4 : 0);
    settings.internal[cell] =
      internal === 'differential' ? 2 * angleAt(views.arms, arm) : angleAt(views.arms, arm);
    settings.external[cell] = angleAt(views.external, 4 * cell + lane);
  }
  const ports = externalAtOutput(chip.style) ? views.input : views.output;
  settings.port?.forEach((_, port) => (settings.port![port] = angleAt(ports, 4 * port + lane)));
  return settings;
}

/** Writes the factors of a target into one lane for the solving kernel. */
function writeFactors(views: TrialViews, lane: Lane, factors: Decomposition, againstLight: boolean): void {
  const { mesh, cosine, sineRe, sineIm, diagonal, diagonalBefore } = factors;
  for (let cell = 0; cell < mesh.cells; cell++) {
    const at = 8 * cell + lane;
    views.wanted[at] = cosine[cell]!;
    views.wanted[at + 2] = sineRe[cell]!;
    views.wanted[at + 4] = sineIm[cell]!;
    views.wanted[at + 6] = Math.hypot(sineRe[cell]!, sineIm[cell]!);
  }
  diagonal.forEach((phase, port) => {
    views.diagonal[4 * port + lane] = Math.cos(phase);
    views.diagonal[4 * port + 2 + lane] = Math.sin(phase);
  });
  // Where the sweep meets the diagonal on each port: at the first cell behind it, or, against the light, at the last one before it.
  for (let port = 0; port < mesh.modes; port++) {
    const before = diagonalBefore[port]!;
    views.diagonalAt[port] = againstLight ? -1 : before === mesh.cells ? -1 : before;
  }
  if (!againstLight) return;
  for (let cell = 0; cell < mesh.cells; cell++) {
    const upper = mesh.upperPortIndex[cell]!;
    for (const port of [upper, upper + 1]) {
      if (cell < diagonalBefore[port]!) views.diagonalAt[port] = cell;
    }
  }
}

import { splitterAmplitude, splitterCount } from '../chip/cellSplitters.js';
import { externalAtOutput } from '../chip/Chip.js';
import type { KernelInstance } from '../kernel/loadKernels.js';
import { STREAMS } from '../random/streams.js';
import { amplitudeFromLossDb, decibelFromPowerRatio } from '../units/decibel.js';
import { requirePossibleCorrelation } from './errorSources.js';
import type { TrialMemory } from './trialMemory.js';
import type { TrialPlan } from './TrialPlan.js';
import type { TrialViews } from './trialViews.js';
import { ALL_LANES } from './trialViews.js';

const WORD = 2 ** 32;

/** Draws the errors of two chips. */
export interface ErrorDraw {
  /** Draws the coupling ratios of trials `first` and `first + 1`, losses included. */
  drawRatios(first: number): void;
  /** Turns the phases that are set by their errors. */
  addPhaseErrors(first: number): void;
}

/**
 * The errors of a plan's process. Each source has a stream of random numbers of its own, so that one source
 * can be switched without another one's numbers changing.
 * @throws InputError for a correlation that the splitters of a cell cannot have
 */
export function createErrorDraw(
  plan: TrialPlan,
  { kernels }: KernelInstance,
  memory: TrialMemory,
  views: TrialViews,
): ErrorDraw {
  const { chip, errors } = plan;
  const { modes, cells, columns } = chip.mesh;
  const atOutput = externalAtOutput(chip.style);
  const { splitters } = chip.style;
  const allSplitters = splitterCount(chip);
  requirePossibleCorrelation(errors, chip.style);
  views.shift.fill(errors.bias);

  function fill(address: number, count: number, stream: number, first: number): void {
    kernels.seedTrials(memory.state, plan.seed % WORD, Math.floor(plan.seed / WORD), stream, first);
    fillMore(address, count);
  }

  function fillMore(address: number, count: number): void {
    if (errors.distribution === 'uniform') kernels.fillUniforms(address, count, memory.state);
    else kernels.fillNormals(address, count, memory.state, memory.layers);
  }

  /** A number for each splitter with the correlations of the process, at `memory.numbers`. */
  function fillLocalField(stream: number, first: number): void {
    if (errors.correlationLength > 0) {
      const columnStep = Math.exp(-1 / errors.correlationLength);
      // Two ports make the height of a cell.
      const portStep = Math.exp(-1 / (2 * errors.correlationLength));
      // One field for the first splitters of all cells, one for the second ones, and so on.
      for (let splitter = 0; splitter < splitters; splitter++) {
        if (splitter === 0) fill(memory.grid, columns * modes, stream, first);
        else fillMore(memory.grid, columns * modes);
        kernels.correlateGrid(memory.grid, columns, modes, columnStep, portStep);
        const numbers = memory.numbers + 16 * splitter;
        kernels.pickPlaces(numbers, 16 * splitters, memory.grid, memory.places, cells);
      }
    } else {
      fill(memory.numbers, allSplitters, stream, first);
    }
    if (errors.pairCorrelation === 0) return;
    if (splitters === 2) kernels.correlatePairs(memory.numbers, cells, errors.pairCorrelation);
    else correlateTriples(views.numbers, cells, errors.pairCorrelation);
  }

  /** Draws the coupling ratios of two trials, losses included. */
  function drawRatios(first: number): void {
    if (errors.biasSigma > 0) {
      fill(memory.numbers, 1, STREAMS.dieBias, first);
      for (const lane of ALL_LANES) {
        views.shift[lane] = errors.bias + errors.biasSigma * views.numbers[lane]!;
      }
    }
    if (errors.sigma > 0) fillLocalField(STREAMS.splitterRatios, first);
    else views.numbers.fill(0);
    kernels.drawRatios(
      memory.ratios,
      allSplitters,
      memory.nominal,
      memory.numbers,
      errors.sigma,
      memory.shift,
      memory.clamped,
    );
    if (errors.sigmaAngle > 0) {
      fillLocalField(STREAMS.splitterAngles, first);
      kernels.turnRatios(memory.ratios, allSplitters, memory.numbers, errors.sigmaAngle);
    }
    if (errors.lossSigmaDb > 0) {
      fill(memory.numbers, allSplitters, STREAMS.splitterLosses, first);
      drawLosses();
    }
  }

  function drawLosses(): void {
    for (let cell = 0; cell < cells; cell++) {
      const eachDb = -decibelFromPowerRatio(splitterAmplitude(chip, cell) ** 2) / splitters;
      for (const lane of ALL_LANES) {
        let sumDb = 0;
        for (let splitter = 0; splitter < splitters; splitter++) {
          const number = views.numbers[2 * (splitters * cell + splitter) + lane]!;
          sumDb += Math.max(0, eachDb + errors.lossSigmaDb * number);
        }
        views.gain[2 * cell + lane] = amplitudeFromLossDb(sumDb);
      }
    }
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

  return { drawRatios, addPhaseErrors };
}

/**
 * Gives any two of the three numbers of each cell the correlation r in [-1/2, 1]; the first is kept, all
 * variances stay 1. With independent x, y, z: x, r x + sqrt(1 - r^2) y and r x + r q y + w z, where
 * q^2 = (1 - r)/(1 + r) and w^2 = (1 - r)(1 + 2r)/(1 + r) (the triangular root of the matrix of correlations).
 */
function correlateTriples(numbers: Float64Array, cells: number, correlation: number): void {
  const fresh = Math.sqrt(1 - correlation * correlation);
  const kept = correlation * Math.sqrt((1 - correlation) / (1 + correlation));
  const last = Math.sqrt(Math.max(0, ((1 - correlation) * (1 + 2 * correlation)) / (1 + correlation)));
  for (let cell = 0; cell < cells; cell++) {
    for (const lane of ALL_LANES) {
      const at = 6 * cell + lane;
      const x = numbers[at]!;
      const y = numbers[at + 2]!;
      numbers[at + 2] = correlation * x + fresh * y;
      numbers[at + 4] = correlation * x + kept * y + last * numbers[at + 4]!;
    }
  }
}

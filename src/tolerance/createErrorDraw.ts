import { externalAtOutput } from '../chip/Chip.js';
import type { KernelInstance } from '../kernel/loadKernels.js';
import { STREAMS } from '../random/streams.js';
import { amplitudeFromLossDb, decibelFromPowerRatio } from '../units/decibel.js';
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
  views.shift.fill(errors.bias);

  function fill(address: number, count: number, stream: number, first: number): void {
    kernels.seedTrials(memory.state, plan.seed % WORD, Math.floor(plan.seed / WORD), stream, first);
    fillMore(address, count);
  }

  function fillMore(address: number, count: number): void {
    if (errors.distribution === 'uniform') kernels.fillUniforms(address, count, memory.state);
    else kernels.fillNormals(address, count, memory.state, memory.layers);
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
      2 * cells,
      memory.nominal,
      memory.numbers,
      errors.sigma,
      memory.shift,
      memory.clamped,
    );
    if (errors.sigmaAngle > 0) {
      fillLocalField(STREAMS.splitterAngles, first);
      kernels.turnRatios(memory.ratios, 2 * cells, memory.numbers, errors.sigmaAngle);
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

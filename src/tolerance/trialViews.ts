import { splitterAmplitude, splitterCount } from '../chip/cellSplitters.js';
import type { Chip } from '../chip/Chip.js';
import { externalAtOutput } from '../chip/Chip.js';
import type { Settings } from '../chip/Settings.js';
import { zeroSettings } from '../chip/shifters.js';
import type { Decomposition } from '../decompose/Decomposition.js';
import type { KernelInstance } from '../kernel/loadKernels.js';
import type { TrialMemory } from './trialMemory.js';

/** The two trials that are side by side. */
export const ALL_LANES = [0, 1] as const;
/** One of the two trials. */
export type Lane = (typeof ALL_LANES)[number];

/** Views of the arrays that are written and read from here. */
export interface TrialViews {
  readonly shift: Float64Array;
  readonly numbers: Float64Array;
  /** Two 64-bit counts; their low words stand at 0 and 2. */
  readonly clampedCounts: Int32Array;
  readonly ratios: Float64Array;
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

/** Takes the views; every array must have been reserved. */
export function takeViews(instance: KernelInstance, memory: TrialMemory, chip: Chip): TrialViews {
  const { modes, cells } = chip.mesh;
  const splitters = splitterCount(chip);
  const inputAddress = instance.reserve(4 * modes);
  const doubles = (address: number, length: number): Float64Array => instance.doubles(address, length);
  const arms = doubles(memory.arms, 8 * cells);
  const external = doubles(memory.external, 4 * cells);
  const input = doubles(inputAddress, 4 * modes);
  const output = doubles(memory.output, 4 * modes);
  const gain = doubles(memory.gain, 2 * cells);
  gain.forEach((_, k) => (gain[k] = splitterAmplitude(chip, k >> 1)));
  for (const [ports, atOutput] of [
    [input, true],
    [output, false],
  ] as const) {
    const amplitudes = portAmplitudes(chip, atOutput, false);
    for (let k = 0; k < ports.length; k++) ports[k] = k % 4 < 2 ? amplitudes[k >> 2]! : 0;
  }
  return {
    shift: doubles(memory.shift, 2),
    numbers: doubles(memory.numbers, 2 * Math.max(splitters, modes, 2)),
    clampedCounts: instance.integers(memory.clamped, 4),
    ratios: doubles(memory.ratios, 2 * splitters),
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

/**
 * Amplitude factors of the ports on one side: facets, the columns' loss (counted at the outputs), and the
 * port shifters' where they are.
 */
export function portAmplitudes(chip: Chip, atInput: boolean, withShifters = chip.portShifters): Float64Array {
  const { loss, mesh } = chip;
  const others = (atInput ? 1 : loss.column ** mesh.columns) * (withShifters ? loss.shifter : 1);
  return (atInput ? loss.input : loss.output).map((facet) => facet * others);
}

/** Writes settings into one lane as complex factors, the shifters' losses included. */
export function writeSettings(views: TrialViews, chip: Chip, lane: Lane, settings: Settings): void {
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
export function readSettings(views: TrialViews, chip: Chip, lane: Lane): Settings {
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
export function writeFactors(
  views: TrialViews,
  lane: Lane,
  factors: Decomposition,
  againstLight: boolean,
): void {
  const { mesh, cosine, sineRe, sineIm, diagonal, diagonalBefore } = factors;
  for (let cell = 0; cell < mesh.cells; cell++) {
    const at = 8 * cell + lane;
    views.wanted[at] = cosine[cell]!;
    const sine = Math.hypot(sineRe[cell]!, sineIm[cell]!);
    views.wanted[at + 2] = sine > 0 ? sineRe[cell]! / sine : 1;
    views.wanted[at + 4] = sine > 0 ? sineIm[cell]! / sine : 0;
    views.wanted[at + 6] = sine;
  }
  diagonal.forEach((phase, port) => {
    views.diagonal[4 * port + lane] = Math.cos(phase);
    views.diagonal[4 * port + 2 + lane] = Math.sin(phase);
  });
  // Where the sweep meets the diagonal on each port: at the first cell behind it, or, against the light, at
  // the last one before it.
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

import type { Chip } from './Chip.js';
import { externalAtOutput } from './Chip.js';
import type { Settings } from './Settings.js';

/** What a shifter is for: a phase of a cell, or one of a port. */
export type ShifterRole = 'input' | 'external' | 'internal' | 'output';

/** One phase shifter of a chip. All fields count from 0. */
export interface Shifter {
  /** Index in the phase table's order; the shifter's number is one more. */
  readonly index: number;
  readonly role: ShifterRole;
  /** Index of the cell, or null for a port shifter. */
  readonly cellIndex: number | null;
  readonly columnIndex: number | null;
  /** Index of the guide that the shifter acts on; for a differential pair the upper one. */
  readonly portIndex: number;
}

/** Number of shifters on the chip: N(N-1), and N more with port shifters. */
export function shifterCount(chip: Chip): number {
  return 2 * chip.mesh.cells + (chip.portShifters ? chip.mesh.modes : 0);
}

/** Indices (from 0) of a cell's two shifters in the phase table's order. */
export function shifterIndicesOfCell(
  chip: Chip,
  cellIndex: number,
): { readonly external: number; readonly internal: number } {
  const atOutput = externalAtOutput(chip.style);
  const first = 2 * cellIndex + (atOutput && chip.portShifters ? chip.mesh.modes : 0);
  return atOutput ? { internal: first, external: first + 1 } : { external: first, internal: first + 1 };
}

/** Index (from 0) of the port shifter on a port (index from 0), on a chip that has them. */
export function shifterIndexOfPort(chip: Chip, portIndex: number): number {
  return externalAtOutput(chip.style) ? portIndex : 2 * chip.mesh.cells + portIndex;
}

/**
 * All shifters in the phase table's order: input phases, then cell by cell as the light meets them, output
 * phases.
 */
export function listShifters(chip: Chip): Shifter[] {
  const { mesh, style } = chip;
  const shifters: Shifter[] = [];
  const add = (role: ShifterRole, cellIndex: number | null, portIndex: number): void => {
    const columnIndex = cellIndex === null ? null : mesh.columnIndex[cellIndex]!;
    shifters.push({ index: shifters.length, role, cellIndex, columnIndex, portIndex });
  };
  const addPortShifters = (role: ShifterRole): void => {
    for (let port = 0; port < mesh.modes; port++) add(role, null, port);
  };
  const atOutput = externalAtOutput(style);
  if (atOutput && chip.portShifters) addPortShifters('input');
  for (let cell = 0; cell < mesh.cells; cell++) {
    const upper = mesh.upperPortIndex[cell]!;
    const externalPort = style.external.startsWith('upper') ? upper : upper + 1;
    const internalPort = style.internal === 'lower' ? upper + 1 : upper;
    if (!atOutput) add('external', cell, externalPort);
    add('internal', cell, internalPort);
    if (atOutput) add('external', cell, externalPort);
  }
  if (!atOutput && chip.portShifters) addPortShifters('output');
  return shifters;
}

/** The phase that the settings give a shifter of the chip. */
export function phaseOf(settings: Settings, shifter: Shifter): number {
  if (shifter.role === 'external') return settings.external[shifter.cellIndex!]!;
  if (shifter.role === 'internal') return settings.internal[shifter.cellIndex!]!;
  return settings.port![shifter.portIndex]!;
}

/** Empty settings (all phases 0) of the right shape for the chip. */
export function zeroSettings(chip: Chip): Settings {
  return {
    external: new Float64Array(chip.mesh.cells),
    internal: new Float64Array(chip.mesh.cells),
    port: chip.portShifters ? new Float64Array(chip.mesh.modes) : null,
  };
}

/**
 * The phases of all shifters in the phase table's order.
 * @throws RangeError when the settings are not of the chip's shape
 */
export function phasesInOrder(chip: Chip, settings: Settings): Float64Array {
  const { cells, modes } = chip.mesh;
  const ports = chip.portShifters ? modes : 0;
  if (
    settings.internal.length !== cells ||
    settings.external.length !== cells ||
    (settings.port?.length ?? 0) !== ports
  ) {
    throw new RangeError(
      `the settings are not those of a chip with ${cells} cells and ${ports} port shifters`,
    );
  }
  const phases = new Float64Array(shifterCount(chip));
  for (let cell = 0; cell < cells; cell++) {
    const { external, internal } = shifterIndicesOfCell(chip, cell);
    phases[external] = settings.external[cell]!;
    phases[internal] = settings.internal[cell]!;
  }
  settings.port?.forEach((phase, port) => (phases[shifterIndexOfPort(chip, port)] = phase));
  return phases;
}

/**
 * The settings whose phases, in the phase table's order, are these.
 * @throws RangeError when there is not one for each shifter
 */
export function settingsFromPhases(chip: Chip, phases: Float64Array): Settings {
  if (phases.length !== shifterCount(chip)) {
    throw new RangeError(`${phases.length} phases for ${shifterCount(chip)} shifters`);
  }
  const settings = zeroSettings(chip);
  for (let cell = 0; cell < chip.mesh.cells; cell++) {
    const { external, internal } = shifterIndicesOfCell(chip, cell);
    settings.external[cell] = phases[external]!;
    settings.internal[cell] = phases[internal]!;
  }
  settings.port?.forEach((_, port) => (settings.port![port] = phases[shifterIndexOfPort(chip, port)]!));
  return settings;
}

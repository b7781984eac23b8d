import type { Chip } from '../chip/Chip.js';
import type { Settings } from '../chip/Settings.js';
import type { ShifterRole } from '../chip/shifters.js';
import { listShifters, phaseOf } from '../chip/shifters.js';

/** One row of a phase table, one shifter. Everything counts from 1. */
export interface PhaseRow {
  readonly shifter: number;
  /** Null for the port shifters, as is `column`. */
  readonly cell: number | null;
  readonly role: ShifterRole;
  readonly column: number | null;
  /** The guide that the shifter acts on; for a differential pair the upper one. */
  readonly port: number;
  readonly phaseRad: number;
  /** The chip file's name of the shifter, or empty. */
  readonly name: string;
}

/** The header line of `phases.csv`, by which a table is known. */
export const PHASE_TABLE_HEADER = 'shifter,cell,role,column,port,phase_rad,name';

/**
 * The rows of the phase table of a chip with these settings, one per shifter in the order of their numbers.
 */
export function phaseRows(chip: Chip, settings: Settings): PhaseRow[] {
  return listShifters(chip).map((shifter) => ({
    shifter: shifter.index + 1,
    cell: shifter.cellIndex === null ? null : shifter.cellIndex + 1,
    role: shifter.role,
    column: shifter.columnIndex === null ? null : shifter.columnIndex + 1,
    port: shifter.portIndex + 1,
    phaseRad: phaseOf(settings, shifter),
    name: chip.shifterNames.get(shifter.index) ?? '',
  }));
}

/**
 * A phase table as CSV: header line first, no comments, full double precision, lines ended by a line feed.
 */
export function formatPhaseCsv(rows: readonly PhaseRow[]): string {
  const lines = rows.map(({ shifter, cell, role, column, port, phaseRad, name }) =>
    [shifter, cell ?? '', role, column ?? '', port, phaseRad, csvField(name)].join(','),
  );
  return `${PHASE_TABLE_HEADER}\n${lines.map((line) => `${line}\n`).join('')}`;
}

function csvField(text: string): string {
  return /[",\r\n]|^\s|\s$/.test(text) ? `"${text.replaceAll('"', '""')}"` : text;
}

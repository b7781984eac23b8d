import type { Chip } from '../chip/Chip.js';
import type { Settings } from '../chip/Settings.js';
import { listShifters, zeroSettings } from '../chip/shifters.js';
import { InputError } from '../errors/InputError.js';
import type { PhaseRow } from './PhaseTable.js';

/**
 * The settings that a phase table gives to a chip. Rows may come in any order.
 * @throws InputError `table/rows` for a shifter that is missing or listed twice, or a row that is not of this
 * chip's mesh and cell style
 */
export function settingsFromRows(chip: Chip, rows: readonly PhaseRow[]): Settings {
  const shifters = listShifters(chip);
  const settings = zeroSettings(chip);
  const seen = new Uint8Array(shifters.length);
  rows.forEach((row, k) => {
    const place = { row: k + 1 };
    const shifter = shifters[row.shifter - 1];
    if (!shifter) {
      throw new InputError(
        'table/rows',
        `there is no shifter ${row.shifter}: the chip has ${shifters.length}`,
        'Use the table that was made for this chip, or name its chip file with --chip.',
        place,
      );
    }
    if (seen[shifter.index]) {
      throw new InputError(
        'table/rows',
        `shifter ${row.shifter} is listed twice`,
        'Keep one row for each shifter.',
        place,
      );
    }
    seen[shifter.index] = 1;
    const expected = {
      cell: shifter.cellIndex === null ? null : shifter.cellIndex + 1,
      role: shifter.role,
      column: shifter.columnIndex === null ? null : shifter.columnIndex + 1,
      port: shifter.portIndex + 1,
    };
    for (const key of ['role', 'cell', 'column', 'port'] as const) {
      if (row[key] === expected[key]) continue;
      throw new InputError(
        'table/rows',
        `shifter ${row.shifter} has ${key} ${row[key] ?? '(none)'}, but ${expected[key] ?? '(none)'} on this chip`,
        'The table was made for another layout, mirror or cell style: use the chip file that it was made for.',
        place,
      );
    }
    if (shifter.role === 'external') settings.external[shifter.cellIndex!] = row.phaseRad;
    else if (shifter.role === 'internal') settings.internal[shifter.cellIndex!] = row.phaseRad;
    else settings.port![shifter.portIndex] = row.phaseRad;
  });
  const missing = seen.indexOf(0);
  if (missing >= 0) {
    const count = seen.reduce((total, one) => total - one, seen.length);
    throw new InputError(
      'table/rows',
      count === 1
        ? `there is no row for shifter ${missing + 1}`
        : `${count} of ${shifters.length} shifters have no row, the first is shifter ${missing + 1}`,
      'A phase table has one row for every shifter of the chip.',
    );
  }
  return settings;
}

import type { Chip } from '../chip/Chip.js';
import { stuckShifters } from '../chip/stuckShifters.js';
import type { AngleUnit } from '../units/angle.js';
import { angleIn } from '../units/angle.js';
import type { OutOfRange, OutOfReach } from '../program/carryingSweep.js';
import type { Console } from './console.js';
import type { JudgedRequirement } from './reportParts.js';
import { shownMerit } from './reportParts.js';

const MOST_LISTED = 5;

/** Says which cells cannot reach what is wanted of them, and what that means. */
export function tellOutOfReach(
  console: Console,
  chip: Chip,
  list: readonly OutOfReach[],
  meaning = 'the nearest in reach is set',
): void {
  if (list.length === 0) return;
  const cells = list.length === 1 ? 'cell cannot reach its' : 'cells cannot reach their';
  console.warning(`${list.length} ${cells} bar power, so ${meaning} (outOfReach in the report):`);
  for (const { cellIndex, wanted, low, high } of list.slice(0, MOST_LISTED)) {
    const column = chip.mesh.columnIndex[cellIndex]! + 1;
    const port = chip.mesh.upperPortIndex[cellIndex]! + 1;
    console.message(
      `  cell ${cellIndex + 1} (column ${column}, ports ${port} and ${port + 1}): wanted ${shortNumber(wanted)}, ` +
        `reach ${shortNumber(low)} to ${shortNumber(high)}`,
    );
  }
  tellRest(console, list.length);
}

/** Says which shifters cannot be set to what is wanted of them. */
export function tellOutOfRange(console: Console, list: readonly OutOfRange[], unit: AngleUnit): void {
  if (list.length === 0) return;
  const one = list.length === 1;
  console.warning(
    `${list.length} ${one ? 'shifter is' : 'shifters are'} out of range and set within it (outOfRange in the report):`,
  );
  for (const { shifterIndex, wantedRad, setRad } of list.slice(0, MOST_LISTED)) {
    console.message(
      `  shifter ${shifterIndex + 1}: wanted ${shownAngle(wantedRad, unit)}, set ${shownAngle(setRad, unit)}`,
    );
  }
  tellRest(console, list.length);
}

function tellRest(console: Console, length: number): void {
  if (length > MOST_LISTED) console.message(`  and ${length - MOST_LISTED} more`);
}

/** Says which requirements are not met. Returns the exit code: 0 when all are, else 1. */
export function tellRequirements(console: Console, judged: readonly JudgedRequirement[], where = ''): 0 | 1 {
  const missed = judged.filter(({ met }) => !met);
  for (const { key, limit, value } of missed) {
    console.warning(`required ${key}=${limit} is not met${where}: it is ${shownMerit(value)}`);
  }
  return missed.length === 0 ? 0 : 1;
}

/** A number of things: `1 cell`, `3 cells`. */
export function counted(count: number, thing: string): string {
  return `${count} ${thing}${count === 1 ? '' : 's'}`;
}

/** An angle with its unit, as it is printed. */
export function shownAngle(angle: number, unit: AngleUnit): string {
  return `${shownAngleNumber(angle, unit)}${{ rad: ' rad', pi: ' pi', deg: ' deg' }[unit]}`;
}

/** An angle as a number in a unit, as it is printed in a column. */
export function shownAngleNumber(angle: number, unit: AngleUnit): string {
  return angleIn(unit, angle).toFixed(unit === 'deg' ? 4 : 6);
}

/** A number with four significant digits. */
export function shortNumber(value: number): string {
  return String(Number(value.toPrecision(4)));
}

/**
 * The cautions that go with phases which end in heaters.
 * @param beyondPi whether an internal phase is beyond pi, as a search may leave it
 */
export function cautions(chip: Chip, beyondPi = false): string[] {
  const limits = chip.shifterRange ?? (chip.shifterRanges.size > stuckShifters(chip).length ? 'own' : null);
  const assumed =
    limits === null
      ? `No shifter limits are given in the chip file; phases are in [0, 2 pi)${internalPhases(chip, beyondPi)}.`
      : limits === 'own'
        ? 'Limits are given for some shifters only; the others are taken to reach [0, 2 pi).'
        : `Shifters are taken to reach ${limits[0]} to ${limits[1]} rad, or their own limits.`;
  return [
    `${assumed} Check them against the ratings of the heaters and drivers before anything is switched on.`,
    "Laser safety (IEC 60825-1), local rules and the maker's ratings come first.",
  ];
}

function internalPhases(chip: Chip, beyondPi: boolean): string {
  if (!beyondPi) return ' and the internal ones in [0, pi]';
  return chip.style.internal === 'differential' ? ' and the internal ones in [0, 4 pi)' : '';
}

import type { Chip } from './Chip.js';

/** A shifter that stays at one phase, whatever is wanted of it. */
export interface StuckShifter {
  /** Index (from 0) of the shifter in the phase table's order. */
  readonly shifterIndex: number;
  readonly phaseRad: number;
}

/** Whether a shifter (index from 0) stays at one phase: its own range is a single one. */
export function isStuck({ shifterRanges }: Chip, shifterIndex: number): boolean {
  const range = shifterRanges.get(shifterIndex);
  return range !== undefined && range[0] === range[1];
}

/** The shifters of a chip whose own range is a single phase, in the phase table's order. */
export function stuckShifters(chip: Chip): StuckShifter[] {
  return Array.from(chip.shifterRanges)
    .filter(([, [low, high]]) => low === high)
    .map(([shifterIndex, [phaseRad]]) => ({ shifterIndex, phaseRad }))
    .sort((a, b) => a.shifterIndex - b.shifterIndex);
}

/** The same chip with those shifters working within the range that all others have. */
export function withoutStuckShifters(chip: Chip): Chip {
  const shifterRanges = new Map(Array.from(chip.shifterRanges).filter(([, [low, high]]) => low !== high));
  return { ...chip, shifterRanges };
}

import type { Chip } from '../chip/Chip.js';

/** What stands at the ends of a guide: the port's number, and its name if it has one. */
export function portLabel(chip: Chip, port: number): string {
  const name = chip.portNames?.[port];
  return name === undefined || name === '' ? String(port + 1) : `${port + 1} ${name}`;
}

/** A port in running text: its number, and its name in brackets if it has one. Index from 0. */
export function portWithName(chip: Chip, port: number): string {
  const name = chip.portNames?.[port];
  return name === undefined || name === '' ? String(port + 1) : `${port + 1} (${name})`;
}

import type { Chip } from '../chip/Chip.js';
import { packageVersion } from '../files/version.js';
import type { Merit } from '../merit/merit.js';
import { isUpperLimit, MERIT_KEYS } from '../merit/merit.js';
import type { OutOfRange, OutOfReach } from '../program/carryingSweep.js';
import type { Requirement } from './commandOptions.js';

/** The report of a command, as data; `runId` and `files` are what the writer of results needs. */
export interface Report extends Readonly<Record<string, unknown>> {
  readonly runId: string;
  readonly files: readonly string[];
}

/** First fields of every report. */
export function reportHead(
  command: string,
  runId: string,
): { version: string; runId: string; command: string } {
  return { version: packageVersion(), runId, command };
}

/** The block `chip` of a report. */
export function chipBlock(chip: Chip): Record<string, unknown> {
  const { name, mesh } = chip;
  return { name, modes: mesh.modes, layout: mesh.layout, cells: mesh.cells, columns: mesh.columns };
}

/** The list `outOfReach` of a report: bar powers, numbers from 1. */
export function outOfReachBlock(chip: Chip, list: readonly OutOfReach[]): Record<string, unknown>[] {
  return list.map(({ cellIndex, wanted, low, high }) => ({
    cell: cellIndex + 1,
    column: chip.mesh.columnIndex[cellIndex]! + 1,
    port: chip.mesh.upperPortIndex[cellIndex]! + 1,
    wanted,
    reach: [low, high],
  }));
}

/** The list `outOfRange` of a report. */
export function outOfRangeBlock(list: readonly OutOfRange[]): Record<string, unknown>[] {
  return list.map(({ shifterIndex, wantedRad, setRad }) => ({
    shifter: shifterIndex + 1,
    wantedRad,
    setRad,
  }));
}

/** The list `missingPortPhases` of a report. */
export function missingPortPhasesBlock(phases: Float64Array | null): { port: number; phaseRad: number }[] {
  return Array.from(phases ?? [], (phaseRad, k) => ({ port: k + 1, phaseRad }));
}

/** A requirement with what was found. */
export interface JudgedRequirement extends Requirement {
  readonly value: number;
  readonly met: boolean;
}

/**
 * Judges requirements: errors must not be over their limit, all other figures not under it. NaN meets none.
 */
export function judge(requirements: readonly Requirement[], merit: Merit): JudgedRequirement[] {
  return requirements.map(({ key, limit }) => {
    const value = merit[key];
    return { key, limit, value, met: isUpperLimit(key) ? value <= limit : value >= limit };
  });
}

/** Figures of merit as people call them. */
export const MERIT_NAMES: Readonly<Record<keyof Merit, string>> = {
  fidelity: 'fidelity',
  averageGateFidelity: 'average gate fidelity',
  portPhaseFreeFidelity: 'port-phase-free fidelity',
  rmsError: 'rms matrix error',
  worstCaseError: 'worst-case error',
  powerDistance: 'power distance',
  transmission: 'transmission',
  transmissionDb: 'transmission (dB)',
};

/** Figures of merit as lines of text, beside them those of the phases of an ideal chip where they differ. */
export function meritLines(merit: Merit, uncorrected: Merit | null = null): string {
  const lines = MERIT_KEYS.map((key) => {
    const name = MERIT_NAMES[key].padEnd(26);
    const value = shownFigure(key, merit);
    return uncorrected ? `${name}${value.padEnd(16)}${shownFigure(key, uncorrected)}` : `${name}${value}`;
  });
  const header = `${''.padEnd(26)}${'these phases'.padEnd(16)}phases of an ideal chip`;
  return (uncorrected ? [header, ...lines] : lines).join('\n');
}

/** Decibels that rounding leaves of no loss. */
const NO_LOSS_DB = 1e-12;

function shownFigure(key: keyof Merit, merit: Merit): string {
  return key === 'transmissionDb' && Math.abs(merit[key]) < NO_LOSS_DB ? '0' : shownMerit(merit[key]);
}

/** Nearer to 1 than rounding leaves it. */
const AS_GOOD_AS_ONE = 1e-12;

/** A figure near 1 shows how far it is from 1 in two digits, any other one six digits. */
export function shownMerit(value: number): string {
  if (Math.abs(value - 1) < AS_GOOD_AS_ONE) return '1';
  const digits = value > 0.99 && value < 1 ? Math.max(6, 2 - Math.floor(Math.log10(1 - value))) : undefined;
  return digits === undefined ? String(Number(value.toPrecision(6))) : value.toFixed(digits);
}

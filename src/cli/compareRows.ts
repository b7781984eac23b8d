import type { Chip } from '../chip/Chip.js';
import { shifterCount } from '../chip/shifters.js';
import type { Merit } from '../merit/merit.js';
import { isUpperLimit } from '../merit/merit.js';
import { cellsPassed } from '../mesh/cellsPassed.js';
import type { Layout } from '../mesh/Mesh.js';
import type { Retuning } from '../program/retunings.js';
import { summarise } from '../statistics/summary.js';
import type { Threshold } from '../tolerance/thresholds.js';
import { columnOf } from '../tolerance/thresholds.js';
import type { TrialPlan } from '../tolerance/TrialPlan.js';
import { decibelFromPowerRatio } from '../units/decibel.js';
import { shortNumber } from './messages.js';
import { MERIT_NAMES } from './reportParts.js';
import type { PlanResults } from './runPlans.js';
import { textTable } from './textTable.js';
import { percent, requireLight, yieldBlock } from './yieldParts.js';

/** What one row is about. */
export interface Entry {
  readonly layout: Layout;
  readonly splitters: number;
  readonly retune: Retuning;
  readonly chip: Chip;
  readonly plan: TrialPlan;
  readonly trials: number;
}

/** A row as the report has it. */
export interface Row {
  readonly layout: Layout;
  readonly splitters: number;
  readonly retune: Retuning;
  readonly fidelity: Mean;
  /** Fidelity won over the retuning in the row before, chip by chip; absent in the first row of a chip. */
  readonly gain?: Mean & { readonly over: Retuning };
  /** The other judged figures. */
  readonly others: Partial<Record<keyof Merit, Mean>>;
  readonly yield: number;
  readonly yieldInterval: readonly [low: number, high: number];
  readonly passed: number;
  readonly trials: number;
  readonly columns: number;
  readonly splitterCount: number;
  readonly shifterCount: number;
  readonly cellsPassed: { readonly fewest: number; readonly most: number };
  readonly splittersPassed: { readonly fewest: number; readonly most: number };
  readonly transmission: Mean;
  readonly transmissionDb: number;
  readonly clamped: number;
}

export interface Mean {
  readonly mean: number;
  readonly standardError: number | null;
}

/** Results of an entry. */
export interface Found {
  readonly entry: Entry;
  readonly results: PlanResults;
}

/**
 * What a retuning wins over another one on the same chips: as these have the same errors, that is known
 * better than either.
 */
function gainOver(before: Found | undefined, { entry, results }: Found, columns: number): Pick<Row, 'gain'> {
  if (before?.entry.chip !== entry.chip) return {};
  const trials = Math.min(results.trials, before.results.trials);
  const won = Float64Array.from(
    { length: trials },
    (_, k) => results.rows[k * columns]! - before.results.rows[k * columns]!,
  );
  const { mean, standardError } = summarise(won);
  return { gain: { over: before.entry.retune, mean, standardError } };
}

/** What decides the judged figures and the yield of a row. */
export interface RowJudgement {
  readonly figures: readonly (keyof Merit)[];
  readonly thresholds: readonly Threshold[];
  readonly confidence: number;
}

/**
 * A row of the comparison. `before`: the entry before it, with whose retuning it is compared where both are of
 * the same chips.
 */
export function rowOf(
  found: Found,
  before: Found | undefined,
  { figures, thresholds, confidence }: RowJudgement,
): Row {
  const { layout, splitters, retune, chip } = found.entry;
  const { results } = found;
  const { mesh } = chip;
  const meanOf = (key: keyof Merit): Mean => {
    const column = columnOf(results.rows, figures.length, figures.indexOf(key));
    requireLight(column, key);
    const { mean, standardError } = summarise(column);
    return { mean, standardError };
  };
  const { share, low, high, passed, trials } = yieldBlock(results, figures, thresholds, confidence);
  const passes = cellsPassed(mesh);
  const transmission = meanOf('transmission');
  const others = figures.filter((key) => key !== 'fidelity' && key !== 'transmission');
  return {
    layout,
    splitters,
    retune,
    fidelity: meanOf('fidelity'),
    ...gainOver(before, found, figures.length),
    others: Object.fromEntries(others.map((key) => [key, meanOf(key)])),
    yield: share,
    yieldInterval: [low, high],
    passed,
    trials,
    columns: mesh.columns,
    splitterCount: splitters * mesh.cells,
    shifterCount: shifterCount(chip),
    cellsPassed: passes,
    splittersPassed: { fewest: splitters * passes.fewest, most: splitters * passes.most },
    transmission,
    transmissionDb: decibelFromPowerRatio(transmission.mean),
    clamped: results.clamped,
  };
}

/** The error that is shown of each row: of what is judged first, as far as it makes one. */
export interface ShownError {
  readonly words: string;
  readonly of: (row: Row) => Mean;
}

export function shownError(thresholds: readonly Threshold[], chip: Chip): ShownError {
  const first = thresholds[0]!.key;
  const isFidelity = (['averageGateFidelity', 'portPhaseFreeFidelity'] as (keyof Merit)[]).includes(first);
  const judged = isUpperLimit(first) || isFidelity;
  const key = judged ? first : 'fidelity';
  const meanOf = (row: Row): Mean => (key === 'fidelity' ? row.fidelity : row.others[key]!);
  if (isUpperLimit(key)) return { words: MERIT_NAMES[key], of: meanOf };
  return {
    words: key === 'fidelity' && chip.portShifters ? 'infidelity 1 \u2212 F' : `1 \u2212 ${MERIT_NAMES[key]}`,
    of: (row) => {
      const { mean, standardError } = meanOf(row);
      return { mean: 1 - mean, standardError };
    },
  };
}

/** The rows as CSV, a header line first. */
export function compareCsv(rows: readonly Row[], figures: readonly (keyof Merit)[]): string {
  const others = figures.filter((key) => key !== 'fidelity' && key !== 'transmission');
  const header = [
    ...['layout', 'splitters', 'retune', 'fidelityMean', 'fidelityStandardError'],
    ...others.flatMap((key) => [`${key}Mean`, `${key}StandardError`]),
    ...['yield', 'yieldLow', 'yieldHigh', 'passed', 'trials', 'columns', 'splitterCount', 'shifterCount'],
    ...['fewestCellsPassed', 'mostCellsPassed', 'transmissionMean', 'transmissionDb'],
  ];
  const table = rows.map((row) => [
    ...[row.layout, row.splitters, row.retune, row.fidelity.mean, row.fidelity.standardError ?? ''],
    ...others.flatMap((key) => [row.others[key]!.mean, row.others[key]!.standardError ?? '']),
    ...[row.yield, ...row.yieldInterval, row.passed, row.trials],
    ...[row.columns, row.splitterCount, row.shifterCount, row.cellsPassed.fewest, row.cellsPassed.most],
    ...[row.transmission.mean, row.transmissionDb],
  ]);
  return `${[header, ...table].map((fields) => fields.join(',')).join('\n')}\n`;
}

/** The rows as a table of text. */
export function compareTable(rows: readonly Row[], shown: ShownError): string {
  return textTable(
    [
      ...['layout', 'a cell', 'retuning', `mean ${shown.words}`, '+-', 'yield', 'chips'],
      ...['columns', 'splitters', 'shifters', 'loss (dB)'],
    ],
    rows.map((row) => {
      const { mean, standardError } = shown.of(row);
      return [
        row.layout,
        String(row.splitters),
        row.retune,
        Math.abs(mean) < ROUNDING ? '0' : mean.toExponential(2),
        standardError === null ? '' : standardError.toExponential(1),
        percent(row.yield),
        ...[row.trials, row.columns, row.splitterCount, row.shifterCount].map(String),
        shownLoss(row.transmissionDb),
      ];
    }),
  );
}

/** A loss without what rounding leaves of none. */
function shownLoss(transmissionDb: number): string {
  return transmissionDb > -LEAST_LOSS_DB ? '0' : shortNumber(-transmissionDb);
}

/** Losses below this are rounding. */
export const LEAST_LOSS_DB = 1e-9;

/** A mean error below this is rounding. */
const ROUNDING = 1e-14;

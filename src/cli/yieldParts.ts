import { InputError } from '../errors/InputError.js';
import type { Merit } from '../merit/merit.js';
import { isUpperLimit } from '../merit/merit.js';
import { clopperPearson } from '../statistics/binomialInterval.js';
import type { Threshold } from '../tolerance/thresholds.js';
import { countPassed } from '../tolerance/thresholds.js';
import { USUAL_ITERATIONS } from '../tolerance/TrialPlan.js';
import type { ChipOptions, OutputOptions, TargetOptions } from './commandOptions.js';
import { settledTargetOptions } from './commandOptions.js';
import { shortNumber } from './messages.js';
import { defaultFolder } from './names.js';
import { chipBlock, MERIT_NAMES } from './reportParts.js';
import type { PlanResults } from './runPlans.js';
import type { TrialOptions } from './trialOptions.js';
import type { Scenario } from './trialScenario.js';

/** Options of the command yield. */
export interface YieldOptions extends OutputOptions, ChipOptions, TargetOptions, TrialOptions {
  readonly within?: number;
  readonly resume?: boolean;
  readonly trial?: number;
  readonly sweep?: string;
  readonly budget?: boolean;
}

/** The options that change the result, besides errors and thresholds. */
export function settledOptions(options: YieldOptions): Record<string, unknown> {
  const { trials, confidence, retune, seed, within, refineIterations, refineSeconds } = options;
  const refine =
    retune === 'refine' ? { refineIterations: refineIterations ?? USUAL_ITERATIONS, refineSeconds } : {};
  return { trials, confidence, retune, ...refine, seed, within, ...settledTargetOptions(options) };
}

/** The default folder of a run that samples chips. */
export function yieldFolder({ source, path }: Scenario, command = 'yield'): string {
  return defaultFolder(command, { text: source, ...(path === undefined ? {} : { path }) });
}

/** The share of chips that keep the thresholds, with its interval. */
export function yieldBlock(
  { rows, trials }: PlanResults,
  figures: readonly (keyof Merit)[],
  thresholds: readonly Threshold[],
  confidence: number,
): { passed: number; trials: number; share: number; low: number; high: number; confidence: number } {
  const passed = countPassed(rows, figures, thresholds);
  return {
    passed,
    trials,
    share: passed / trials,
    ...clopperPearson(passed, trials, confidence),
    confidence,
  };
}

/** The blocks `target` and `chip` of a report. */
export function scenarioBlocks({ source, target, readChip: { chip } }: Scenario): Record<string, unknown> {
  return {
    target: {
      source,
      modes: chip.mesh.modes,
      unitarityDefect: target?.unitarityDefect ?? 0,
      nearestDistance: target?.nearestDistance ?? null,
    },
    chip: chipBlock(chip),
  };
}

/** A chip through which no light comes has no figures of merit that could be summed up. */
export function requireLight(column: Float64Array, key: keyof Merit): void {
  const dark = column.findIndex((value) => !Number.isFinite(value));
  if (dark < 0) return;
  throw new InputError(
    'yield/dark',
    `trial ${dark + 1} has no ${MERIT_NAMES[key]}: no light comes through the chip`,
    'Look at the losses of the chip, or judge other figures.',
  );
}

/** A threshold as people write it. */
export function thresholdWords({ key, limit }: Threshold): string {
  return `${MERIT_NAMES[key]} ${isUpperLimit(key) ? '\u2264' : '\u2265'} ${limit}`;
}

/** A share in percent. */
export function percent(share: number): string {
  return `${shortNumber(100 * share)} %`;
}

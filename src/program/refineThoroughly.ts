import type { Chip, PhaseRange } from '../chip/Chip.js';
import type { Settings } from '../chip/Settings.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { takeColumns } from '../matrix/takeColumns.js';
import type { CostDescription } from '../merit/createCost.js';
import { createCost } from '../merit/createCost.js';
import { simulate } from '../simulate/simulate.js';
import { principalSettings } from './principalSettings.js';
import { randomSettings } from './randomSettings.js';
import type { RefinedSettings, RefineOptions } from './refineSettings.js';
import { refineInterruptibly } from './refineSettings.js';

/** What {@link refineThoroughly} found. */
export interface ThoroughlyRefined extends RefinedSettings {
  /** Starts that were searched from: the best of those given, and random ones. */
  readonly starts: number;
}

/** Time left for a start when the time granted is over: enough to look at it once. */
const LEAST_SECONDS = 1e-3;
/** Random starts besides those given, and the largest chip that is worth them. */
const MORE_STARTS = 4;
const LARGEST_FOR_MORE_STARTS = 24;
/** Figures that differ by no more are the same to rounding. */
const SAME_FIGURE = 1e-12;

/**
 * The best phases of a chip that some searches find: from the best of the starts and, where shifters are limited
 * or stuck, from random ones, since near its programmed phases such a chip has poor local minima. Phases come
 * back as a plain program would have them where that changes nothing but rounding. Never worse than the best
 * start. The limits of time hold for all searches together, those of iterations for each.
 * @throws RangeError as `refineSettings` does
 */
export async function refineThoroughly(
  chip: Chip,
  target: ComplexMatrix,
  starts: readonly Settings[],
  description: CostDescription,
  options: RefineOptions = {},
): Promise<ThoroughlyRefined> {
  const { mostSeconds = Infinity, now = () => performance.now() } = options;
  const began = now();
  let best = await refineInterruptibly(chip, target, starts, description, options);
  const { costBefore, figureBefore } = best;
  let tried = 1;
  while (tried <= moreStarts(chip) && best.stopped !== 'interrupted' && best.stopped !== 'time') {
    const left = Math.max(mostSeconds - (now() - began) / 1000, LEAST_SECONDS);
    const other = await refineInterruptibly(chip, target, [randomSettings(chip, tried - 1)], description, {
      ...options,
      mostSeconds: left,
    });
    const { stopped } = other;
    if (other.cost < best.cost) best = { ...other, costBefore, figureBefore };
    if (stopped === 'interrupted' || stopped === 'time') best = { ...best, stopped };
    tried++;
  }
  return { ...best, settings: asProgrammed(chip, target, best, description), starts: tried };
}

function moreStarts({ mesh, shifterRange, shifterRanges }: Chip): number {
  const isLimited = isShort(shifterRange) || Array.from(shifterRanges.values()).some(isShort);
  return isLimited && mesh.modes <= LARGEST_FOR_MORE_STARTS ? MORE_STARTS : 0;
}

function isShort(range: PhaseRange | null): boolean {
  return range !== null && range[1] - range[0] < 2 * Math.PI;
}

/** The refined phases as a plain program would have them, where that changes nothing but rounding. */
function asProgrammed(
  chip: Chip,
  target: ComplexMatrix,
  { settings, figureBefore }: RefinedSettings,
  description: CostDescription,
): Settings {
  const cost = createCost(target, description);
  const figureOf = (one: Settings): number => cost.figure(takeColumns(simulate(chip, one), cost.inputs));
  const principal = principalSettings(chip, settings);
  const figure = figureOf(principal);
  const isSame = Math.abs(figure - figureOf(settings)) <= SAME_FIGURE;
  // What a refinement began with is never given up, not even by a rounding.
  const isWorse = description.figure === 'powerDistance' ? figure > figureBefore : figure < figureBefore;
  return isSame && !isWorse ? principal : settings;
}

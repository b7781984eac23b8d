import { clopperPearson } from '../statistics/binomialInterval.js';

/** How often chips were good at one value of a source. */
export interface YieldCount {
  readonly passed: number;
  readonly trials: number;
}

/** How far a quantity may go while a yield still holds. */
export interface ToleranceEstimate {
  /**
   * `holds nowhere`: it fails already where the search begins. `holds everywhere`: no value up to the end of
   * the range makes it fail.
   */
  readonly outcome: 'found' | 'holds everywhere' | 'holds nowhere';
  /**
   * The value up to which the share of good chips reaches the yield; where the search begins when it holds
   * nowhere, Infinity when it holds everywhere.
   */
  readonly value: number;
  /** The same by the lower end of the share's interval. */
  readonly low: number;
  /** The same by the upper end. */
  readonly high: number;
  /** Every value that was tried, rising, with what was found. */
  readonly tried: readonly TriedValue[];
}

/** What was found at a value. */
export interface TriedValue extends YieldCount {
  readonly value: number;
}

/** What is asked of a search. */
interface ToleranceQuestion {
  /** Share of good chips wanted, between 0 and 1. */
  readonly yieldWanted: number;
  readonly confidence: number;
  /**
   * Counts the good chips at a value. The same random numbers at each value (common random numbers) make the
   * count fall steadily, so that a bracket means something.
   */
  readonly count: (value: number) => Promise<YieldCount>;
}

/** A search of a quantity whose growth makes chips worse. */
export interface ToleranceSearch extends ToleranceQuestion {
  /** Where the quantity does no harm; 0 if not given. */
  readonly from?: number;
  /** How far from there to begin, above 0. */
  readonly start: number;
  /** How far from there the values go that make sense. */
  readonly most: number;
  /** Width at which the bracketing ends, relative to the distance from there. */
  readonly precision?: number;
}

/** A search of a quantity whose growth may make chips better again. */
export interface LadderSearch extends ToleranceQuestion {
  /** Values that are tried one after the other, rising. */
  readonly rungs: readonly number[];
  /** Only whole numbers make sense. */
  readonly whole?: boolean;
  /** Relative width at which the bracketing between two rungs ends. */
  readonly precision?: number;
}

const USUAL_PRECISION = 1e-3;
/** Below this no spread means anything. */
const LEAST = 1e-9;

/**
 * Finds the fewest bits, from 1 to `most`, with which a yield holds, and the numbers between which the
 * sampling leaves it: `low` by the upper end of the share's interval, `high` by the lower. Infinity, and
 * `holds nowhere`, where not even the most bits are enough. More bits never make chips worse, so that halving
 * the range finds them.
 */
export async function findFewestBits({
  most,
  ...question
}: ToleranceQuestion & { readonly most: number }): Promise<ToleranceEstimate> {
  const fewest: Search = async (holdsAt) => {
    if (!(await holdsAt(most))) return Infinity;
    let [tooFew, enough] = [0, most];
    while (enough - tooFew > 1) {
      const middle = Math.floor((tooFew + enough) / 2);
      if (await holdsAt(middle)) enough = middle;
      else tooFew = middle;
    }
    return enough;
  };
  const { value, byLower, byUpper, tried } = await searchThrice(question, fewest);
  const outcome = value === Infinity ? 'holds nowhere' : 'found';
  return { outcome, value, low: byUpper, high: byLower, tried };
}

/**
 * Finds the largest value for which a yield still holds, of a quantity whose growth makes chips worse, and the
 * values between which the sampling leaves it.
 */
export async function findTolerance({
  from = 0,
  start,
  most,
  precision = USUAL_PRECISION,
  ...question
}: ToleranceSearch): Promise<ToleranceEstimate> {
  const largest: Search = async (holdsAt) => {
    const holdsBeyond = (distance: number): Promise<boolean> => holdsAt(from + distance);
    let [low, high] = [0, start];
    while (await holdsBeyond(high)) {
      if (high >= most) return Infinity;
      [low, high] = [high, Math.min(most, 2 * high)];
    }
    if (low === 0 && !(await holdsBeyond(LEAST))) return from;
    while (high - low > precision * high && high > LEAST) {
      const middle = (low + high) / 2;
      if (await holdsBeyond(middle)) low = middle;
      else high = middle;
    }
    return from + (low + high) / 2;
  };
  return rising(await searchThrice(question, largest), from);
}

/**
 * Finds how far up a ladder a yield holds, of a quantity whose growth may do good as well as harm: at every
 * rung up to there, and between the last of them and the first at which it fails as far as halving that step
 * tells. What lies beyond is not looked at. 0, and `holds nowhere`, when it fails at the first rung.
 */
export async function findOnLadder({
  rungs,
  whole = false,
  precision = USUAL_PRECISION,
  ...question
}: LadderSearch): Promise<ToleranceEstimate> {
  const firstCrossing: Search = async (holdsAt) => {
    let k = 0;
    while (k < rungs.length && (await holdsAt(rungs[k]!))) k++;
    if (k === 0) return 0;
    if (k === rungs.length) return Infinity;
    let [low, high] = [rungs[k - 1]!, rungs[k]!];
    while (high - low > (whole ? 1 : precision * high)) {
      const middle = whole ? Math.floor((low + high) / 2) : (low + high) / 2;
      if (await holdsAt(middle)) low = middle;
      else high = middle;
    }
    return whole ? low : (low + high) / 2;
  };
  return rising(await searchThrice(question, firstCrossing), 0);
}

/** The two values next to each other between which a yield is lost, as far as values were tried. */
export interface Bracket {
  /** Where it still holds, nearest to where it fails; absent when it held at none. */
  readonly holds?: number;
  /** Where it fails, nearest to where it holds; absent when it failed at none. */
  readonly fails?: number;
}

/**
 * What the values tried so far say of the tolerance, in any order.
 * @param growthHarms false for bits, of which more are better
 */
export function bracketSoFar(
  tried: readonly TriedValue[],
  yieldWanted: number,
  growthHarms: boolean,
): Bracket {
  const sign = growthHarms ? 1 : -1;
  const placesOf = (held: boolean): number[] =>
    tried.filter((found) => reaches(found, yieldWanted) === held).map(({ value }) => sign * value);
  const fails = Math.min(...placesOf(false));
  const holds = Math.max(...placesOf(true).filter((place) => place < fails));
  return {
    ...(Number.isFinite(holds) ? { holds: sign * holds } : {}),
    ...(Number.isFinite(fails) ? { fails: sign * fails } : {}),
  };
}

/** A way to look for a value, told at each one whether the yield holds there. */
type Search = (holdsAt: (value: number) => Promise<boolean>) => Promise<number>;

/** What a search finds by the share, and by the two ends of its interval. */
interface SearchedThrice {
  readonly value: number;
  readonly byLower: number;
  readonly byUpper: number;
  readonly tried: readonly TriedValue[];
}

/**
 * Three searches on the same counts: by the share, and by the two ends of its Clopper-Pearson interval. Every
 * value is counted once, however often it is asked for.
 */
async function searchThrice(
  { yieldWanted, confidence, count }: ToleranceQuestion,
  search: Search,
): Promise<SearchedThrice> {
  const tried = new Map<number, YieldCount>();
  const searchBy = (holds: (found: YieldCount) => boolean): Promise<number> =>
    search(async (value) => {
      const found = tried.get(value) ?? (await count(value));
      tried.set(value, found);
      return holds(found);
    });
  const interval = ({ passed, trials }: YieldCount): ReturnType<typeof clopperPearson> =>
    clopperPearson(passed, trials, confidence);
  const value = await searchBy((found) => reaches(found, yieldWanted));
  const byLower = await searchBy((found) => interval(found).low >= yieldWanted);
  const byUpper = await searchBy((found) => interval(found).high >= yieldWanted);
  const ordered = [...tried].sort(([a], [b]) => a - b);
  return { value, byLower, byUpper, tried: ordered.map(([at, found]) => ({ value: at, ...found })) };
}

function reaches({ passed, trials }: YieldCount, yieldWanted: number): boolean {
  return passed >= yieldWanted * trials;
}

/** @param nowhere what a search returns when the yield fails where it begins */
function rising({ value, byLower, byUpper, tried }: SearchedThrice, nowhere: number): ToleranceEstimate {
  const outcome = value === Infinity ? 'holds everywhere' : value === nowhere ? 'holds nowhere' : 'found';
  return { outcome, value, low: byLower, high: byUpper, tried };
}

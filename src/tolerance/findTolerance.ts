import { clopperPearson } from '../statistics/binomialInterval.js';

/** How often chips were good at one value of a source. */
export interface YieldCount {
  readonly passed: number;
  readonly trials: number;
}

/** The largest value of a source for which the yield still holds. */
export interface ToleranceEstimate {
  /** Largest value at which the share of good chips reaches the yield; 0 when not even the smallest does. */
  readonly value: number;
  /** Largest value at which the lower end of the share's interval reaches it. */
  readonly low: number;
  /**
   * Largest value at which the upper end does; Infinity when no value up to the largest makes it fall below.
   */
  readonly high: number;
  /** Every value that was tried, rising, with what was found. */
  readonly tried: readonly (YieldCount & { readonly value: number })[];
}

/** What is searched, and how well. */
export interface ToleranceSearch {
  /** Share of good chips wanted, between 0 and 1. */
  readonly yieldWanted: number;
  readonly confidence: number;
  /** Where to begin, above 0. */
  readonly start: number;
  /** The largest value that makes sense. */
  readonly most: number;
  /** Relative width at which the bracketing ends. */
  readonly precision?: number;
  /**
   * Counts the good chips at a value. The same random numbers at each value (common random numbers) make the
   * count fall steadily, so that a bracket means something.
   */
  readonly count: (value: number) => Promise<YieldCount>;
}

const USUAL_PRECISION = 1e-3;
/** Below this no spread means anything. */
const LEAST = 1e-9;

/**
 * Finds the fewest bits, from 1 to `most`, with which a yield holds, and the numbers between which the sampling leaves it: `low` by the
 * upper end of the share's interval, `high` by the lower. Infinity where not even the most bits are enough. More bits never make
 * chips worse, so that halving the range finds them.
 */
export async function findFewestBits({
  yieldWanted,
  confidence,
  most,
  count,
}: Pick<ToleranceSearch, 'yieldWanted' | 'confidence' | 'most' | 'count'>): Promise<ToleranceEstimate> {
  const { tried, countAt } = rememberCounts(count);
  const fewest = async (holds: (found: YieldCount) => boolean): Promise<number> => {
    if (!holds(await countAt(most))) return Infinity;
    let [tooFew, enough] = [0, most];
    while (enough - tooFew > 1) {
      const middle = Math.floor((tooFew + enough) / 2);
      if (holds(await countAt(middle))) enough = middle;
      else tooFew = middle;
    }
    return enough;
  };
  return estimate(fewest, yieldWanted, confidence, tried, ['high', 'low']);
}

/**
 * Finds the largest value of an error source for which a yield still holds, and the values between which the
 * sampling leaves it: three bracketings on the same counts, one each for the share and the two ends of its
 * Clopper-Pearson interval.
 */
export async function findTolerance(search: ToleranceSearch): Promise<ToleranceEstimate> {
  const { yieldWanted, confidence, precision = USUAL_PRECISION } = search;
  const { tried, countAt } = rememberCounts(search.count);
  const largest = async (holds: (found: YieldCount) => boolean): Promise<number> => {
    let [low, high] = [0, search.start];
    while (holds(await countAt(high))) {
      if (high >= search.most) return Infinity;
      [low, high] = [high, Math.min(search.most, 2 * high)];
    }
    while (low === 0) {
      if (high < LEAST) return 0;
      const middle = high / 2;
      if (holds(await countAt(middle))) low = middle;
      else high = middle;
    }
    while (high - low > precision * high) {
      const middle = (low + high) / 2;
      if (holds(await countAt(middle))) low = middle;
      else high = middle;
    }
    return (low + high) / 2;
  };
  return estimate(largest, yieldWanted, confidence, tried, ['low', 'high']);
}

/** Every value is counted once, however often it is asked for. */
function rememberCounts(count: ToleranceSearch['count']): {
  readonly tried: ReadonlyMap<number, YieldCount>;
  readonly countAt: ToleranceSearch['count'];
} {
  const tried = new Map<number, YieldCount>();
  const countAt = async (value: number): Promise<YieldCount> => {
    const known = tried.get(value);
    if (known !== undefined) return known;
    const found = await count(value);
    tried.set(value, found);
    return found;
  };
  return { tried, countAt };
}

/**
 * Three searches on the same counts: by the share, and by the two ends of its interval.
 * @param ends what the search by the lower end of the interval finds, and that by the upper end
 */
async function estimate(
  search: (holds: (found: YieldCount) => boolean) => Promise<number>,
  yieldWanted: number,
  confidence: number,
  tried: ReadonlyMap<number, YieldCount>,
  ends: readonly ['low', 'high'] | readonly ['high', 'low'],
): Promise<ToleranceEstimate> {
  const interval = ({ passed, trials }: YieldCount): ReturnType<typeof clopperPearson> =>
    clopperPearson(passed, trials, confidence);
  const value = await search(({ passed, trials }) => passed >= yieldWanted * trials);
  const byLower = await search((found) => interval(found).low >= yieldWanted);
  const byUpper = await search((found) => interval(found).high >= yieldWanted);
  const [low, high] = ends[0] === 'low' ? [byLower, byUpper] : [byUpper, byLower];
  const rising = [...tried].sort(([a], [b]) => a - b);
  return { value, low, high, tried: rising.map(([at, found]) => ({ value: at, ...found })) };
}

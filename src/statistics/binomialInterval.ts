import { inverseIncompleteBeta } from './incompleteBeta.js';
import { normalQuantile } from './normalDistribution.js';

/** A confidence interval; both ends belong to it. */
export interface Interval {
  readonly low: number;
  readonly high: number;
}

/**
 * The interval of Clopper and Pearson (Biometrika 26, 404 (1934)) for a probability of which `successes` in
 * `trials` were seen: all shares that neither one-sided binomial test at half of 1 - confidence rejects. It
 * covers the true share with at least the stated confidence whatever that share is. Exactly 0 at the low end
 * for no success, exactly 1 at the high end for no failure. Cost: about 10 incomplete beta functions.
 * @param confidence larger than 0 and smaller than 1, such as 0.95
 * @throws RangeError unless 0 <= successes <= trials are whole, with at least one trial
 */
export function clopperPearson(successes: number, trials: number, confidence: number): Interval {
  requireCounts(successes, trials, confidence);
  const tail = (1 - confidence) / 2;
  const failures = trials - successes;
  // The high end from the failures: a share near 1 is one minus a small number, and that one is known well.
  return {
    low: successes === 0 ? 0 : inverseIncompleteBeta(tail, successes, failures + 1),
    high: failures === 0 ? 1 : 1 - inverseIncompleteBeta(tail, failures, successes + 1),
  };
}

/**
 * The score interval of Wilson (J. Am. Stat. Assoc. 22, 209 (1927)), without continuity correction: shorter
 * than Clopper and Pearson's, with the stated confidence on average only.
 * @param confidence larger than 0 and smaller than 1
 * @throws RangeError as `clopperPearson`
 */
export function wilson(successes: number, trials: number, confidence: number): Interval {
  requireCounts(successes, trials, confidence);
  const z = -normalQuantile((1 - confidence) / 2);
  const share = successes / trials;
  const weight = (z * z) / trials;
  const centre = share + weight / 2;
  const half = z * Math.sqrt((share * (1 - share)) / trials + weight / (4 * trials));
  return {
    low: successes === 0 ? 0 : (centre - half) / (1 + weight),
    high: successes === trials ? 1 : (centre + half) / (1 + weight),
  };
}

function requireCounts(successes: number, trials: number, confidence: number): void {
  const whole = Number.isSafeInteger(successes) && Number.isSafeInteger(trials);
  if (!(whole && trials >= 1 && successes >= 0 && successes <= trials)) {
    throw new RangeError(`${successes} of ${trials} is not a count of successes in at least one trial`);
  }
  requireConfidence(confidence);
}

/** @throws RangeError unless 0 < confidence < 1 */
export function requireConfidence(confidence: number): void {
  if (!(confidence > 0 && confidence < 1)) {
    throw new RangeError(`a confidence lies between 0 and 1, got ${confidence}`);
  }
}

import { incompleteBeta } from './incompleteBeta.js';

/**
 * Probability of at most `successes` successes in `trials` independent trials, each with probability `share`:
 * I_(1-share)(trials - successes, successes + 1), NIST DLMF 8.17.5. Cost as `incompleteBeta`.
 * @param successes any whole number; below 0 the probability is 0, from `trials` on it is 1
 * @throws RangeError for counts that are not whole, fewer than 0 trials, or a share outside [0, 1]
 */
export function binomialCdf(successes: number, trials: number, share: number): number {
  if (!(Number.isInteger(successes) && Number.isInteger(trials) && trials >= 0)) {
    throw new RangeError(`${successes} successes in ${trials} trials are not counts`);
  }
  if (!(share >= 0 && share <= 1)) throw new RangeError(`a probability cannot be ${share}`);
  if (successes < 0) return 0;
  if (successes >= trials) return 1;
  return incompleteBeta(1 - share, trials - successes, successes + 1);
}

import { normalQuantile } from './normalDistribution.js';
import { stirlingError } from './stirlingError.js';

const SMALLEST = 1e-300;
/** A few units in the last place: the inverse moves no further. */
const STEP_TOLERANCE = 4 * Number.EPSILON;

/**
 * The regularised incomplete beta function I_x(a, b): the probability that a Beta(a, b) variable is at most
 * x.
 *
 * The continued fraction of NIST DLMF 8.17.22, evaluated forward by Lentz's method as Thompson and Barnett
 * amended it (J. Comput. Phys. 64, 490 (1986)), on the side of the mean where it converges fast. The factor
 * before it is written in Stirling errors, so that a and b of millions cost no digits: relative error about
 * 1e-13 up to a + b = 1e7, and what the rounding of x itself brings. Cost: about 3 sqrt(max(a, b)) steps at
 * worst, near the mean.
 * @param x from 0 to 1, both included
 * @param a larger than 0
 * @param b larger than 0
 * @throws RangeError for anything else
 */
export function incompleteBeta(x: number, a: number, b: number): number {
  if (!(x >= 0 && x <= 1)) throw new RangeError(`x of an incomplete beta function is ${x}, not in [0, 1]`);
  requireShape(a, b);
  if (x === 0 || x === 1) return x;
  const below = x < (a + 1) / (a + b + 2);
  const density = betaPower(x, a, b);
  return below ? density / (a * fraction(x, a, b)) : 1 - density / (b * fraction(1 - x, b, a));
}

/**
 * The x at which I_x(a, b) = probability, by Newton's steps inside a bracket that shrinks whenever a step
 * would leave it. Postcondition: x is as close as `incompleteBeta` can tell, about 1e-13 of itself. Cost:
 * some 5 to 10 evaluations of it.
 * @param probability from 0 to 1, both included
 * @throws RangeError for another probability, or unless a > 0 and b > 0
 */
export function inverseIncompleteBeta(probability: number, a: number, b: number): number {
  if (!(probability >= 0 && probability <= 1)) throw new RangeError(`a probability cannot be ${probability}`);
  requireShape(a, b);
  if (probability === 0 || probability === 1) return probability;
  let [low, high] = [0, 1];
  let x = normalGuess(probability, a, b);
  // Halving alone would end after 1100 steps, at the smallest number there is.
  for (let step = 0; step < 1100; step++) {
    const excess = incompleteBeta(x, a, b) - probability;
    if (excess === 0) return x;
    if (excess < 0) low = x;
    else high = x;
    const density = betaPower(x, a, b) / (x * (1 - x));
    const newton = x - excess / density;
    const next = newton > low && newton < high ? newton : (low + high) / 2;
    if (!(Math.abs(next - x) > STEP_TOLERANCE * x)) return next;
    x = next;
  }
  return x;
}

function requireShape(a: number, b: number): void {
  if (!(a > 0 && a < Infinity && b > 0 && b < Infinity)) {
    throw new RangeError(`the parameters of a beta distribution are ${a} and ${b}, not positive numbers`);
  }
}

/** A normal variable of the same mean and variance; only a start. */
function normalGuess(probability: number, a: number, b: number): number {
  const mean = a / (a + b);
  const deviation = Math.sqrt((mean * (1 - mean)) / (a + b + 1));
  const guess = mean + deviation * normalQuantile(probability);
  return guess > 0 && guess < 1 ? guess : mean;
}

/**
 * x^a (1 - x)^b / B(a, b), as Loader writes binomial probabilities: deviances and Stirling errors instead of
 * powers.
 */
function betaPower(x: number, a: number, b: number): number {
  const n = a + b;
  const deviance = devianceTerm(a, n * x) + devianceTerm(b, n * (1 - x));
  const stirling = stirlingError(n) - stirlingError(a) - stirlingError(b);
  return Math.sqrt((a / n) * (b / (2 * Math.PI))) * Math.exp(stirling - deviance);
}

/** found log(found/expected) + expected - found, without the cancellation where the two are close. */
function devianceTerm(found: number, expected: number): number {
  const ratio = (found - expected) / (found + expected);
  if (!(Math.abs(ratio) < 0.1)) return found * Math.log(found / expected) + expected - found;
  // log(found/expected) = 2 atanh(ratio), summed after its first term, which partly cancels with expected -
  // found
  const square = ratio * ratio;
  let power = 2 * found * ratio;
  let sum = (found - expected) * ratio;
  for (let odd = 3; ; odd += 2) {
    power *= square;
    const next = sum + power / odd;
    if (next === sum) return sum;
    sum = next;
  }
}

/** The denominator 1 + d1/(1 + d2/(1 + ...)) of DLMF 8.17.22. */
function fraction(x: number, a: number, b: number): number {
  let value = 1;
  let numerators = 1;
  let denominators = 0;
  const limit = 1000 + 20 * Math.sqrt(a + b);
  for (let m = 0; m < limit; m++) {
    const odd = (-(a + m) * (a + b + m) * x) / ((a + 2 * m) * (a + 2 * m + 1));
    const even = ((m + 1) * (b - m - 1) * x) / ((a + 2 * m + 1) * (a + 2 * m + 2));
    for (const coefficient of [odd, even]) {
      denominators = 1 / awayFromZero(1 + coefficient * denominators);
      numerators = awayFromZero(1 + coefficient / numerators);
      value *= numerators * denominators;
    }
    if (Math.abs(numerators * denominators - 1) < Number.EPSILON) return value;
  }
  throw new Error(`the continued fraction of I_x(a, b) did not converge: x ${x}, a ${a}, b ${b}`);
}

function awayFromZero(value: number): number {
  return Math.abs(value) < SMALLEST ? SMALLEST : value;
}

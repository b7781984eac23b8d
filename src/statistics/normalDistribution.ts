const TWO_OVER_ROOT_PI = 2 / Math.sqrt(Math.PI);
/** Where the series of erf gives way to the continued fraction of erfc. */
const SERIES_END = 1;

/**
 * Probability that a standard normal variable is at most x. Relative error below 1e-14 in the lower tail too,
 * down to the smallest numbers; for the upper tail take `normalCdf(-x)`.
 */
export function normalCdf(x: number): number {
  return 0.5 * complementaryErrorFunction(-x * Math.SQRT1_2);
}

/**
 * The x at which `normalCdf(x) = probability`; minus and plus infinity for 0 and 1. Relative error about
 * 1e-15, near the median too.
 *
 * A rational start (Abramowitz and Stegun 26.2.23, absolute error 4.5e-4), then two of Halley's steps, each
 * of which cubes the error.
 * @throws RangeError for anything outside [0, 1]
 */
export function normalQuantile(probability: number): number {
  if (!(probability >= 0 && probability <= 1)) throw new RangeError(`a probability cannot be ${probability}`);
  if (probability > 0.5) return -normalQuantile(1 - probability);
  if (probability === 0.5) return 0;
  if (probability === 0) return -Infinity;
  let x = -rationalStart(probability);
  for (let step = 0; step < 2; step++) {
    const density = Math.exp((-x * x) / 2) / Math.sqrt(2 * Math.PI);
    const newton = excess(x, probability) / density;
    x -= newton / (1 + (x * newton) / 2);
  }
  return x;
}

/** normalCdf(x) - probability; near the median without subtracting the one half that both contain. */
function excess(x: number, probability: number): number {
  if (probability < 0.25) return normalCdf(x) - probability;
  return 0.5 * errorFunctionSeries(x * Math.SQRT1_2) - (probability - 0.5);
}

function rationalStart(probability: number): number {
  const t = Math.sqrt(-2 * Math.log(probability));
  const numerator = 2.515517 + t * (0.802853 + t * 0.010328);
  const denominator = 1 + t * (1.432788 + t * (0.189269 + t * 0.001308));
  return t - numerator / denominator;
}

/**
 * erfc(x) = 1 - erf(x), with a small relative error however small it is.
 * Below 1 from the series of erf, above from the continued fraction of NIST DLMF 7.9.2 by Lentz's method.
 */
export function complementaryErrorFunction(x: number): number {
  if (Number.isNaN(x)) return NaN;
  if (x < 0) return 2 - complementaryErrorFunction(-x);
  if (x < SERIES_END) return 1 - errorFunctionSeries(x);
  // erfc(27.3) is below the smallest number.
  return x > 28 ? 0 : (gaussian(x) * tailFraction(x)) / Math.sqrt(Math.PI);
}

/** erf(x) = 2/sqrt(pi) exp(-x^2) sum of 2^n x^(2n+1)/(2n+1)!!, all terms of one sign: NIST DLMF 7.6.2. */
function errorFunctionSeries(x: number): number {
  let term = x;
  let sum = x;
  for (let n = 1; ; n++) {
    term *= (2 * x * x) / (2 * n + 1);
    if (sum + term === sum) return TWO_OVER_ROOT_PI * gaussian(x) * sum;
    sum += term;
  }
}

/** exp(-x^2) with x^2 in two parts, of which the larger is exact, so that its rounding is not blown up. */
function gaussian(x: number): number {
  const coarse = Math.trunc(x * 16) / 16;
  return Math.exp(-coarse * coarse) * Math.exp(-(x - coarse) * (x + coarse));
}

/** 1/(x + (1/2)/(x + 1/(x + (3/2)/(x + ...)))), for x >= 1. */
function tailFraction(x: number): number {
  let value = x;
  let numerators = x;
  let denominators = 0;
  for (let k = 1; ; k++) {
    denominators = 1 / (x + (k / 2) * denominators);
    numerators = x + k / 2 / numerators;
    value *= numerators * denominators;
    if (Math.abs(numerators * denominators - 1) < Number.EPSILON) return 1 / value;
  }
}

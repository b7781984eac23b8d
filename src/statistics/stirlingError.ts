const HALF_LOG_TWO_PI = 0.5 * Math.log(2 * Math.PI);
/** From here on the series below is exact to the last digit. */
const LARGE = 16;
/** B_2k / (2k (2k - 1)) for k = 1..6, with Bernoulli's numbers B_2k: NIST DLMF 5.11.1. */
const SERIES = [1 / 12, -1 / 360, 1 / 1260, -1 / 1680, 1 / 1188, -691 / 360360] as const;

/**
 * What Stirling's formula leaves out: log Gamma(x) - ((x - 1/2) log x - x + log(2 pi)/2), for x > 0. The
 * products of large gamma functions in binomial and beta distributions are accurate only when written in this
 * small number (C. Loader, Fast and accurate computation of binomial probabilities, 2000). Absolute error
 * about 1e-15; a dozen operations from 16 on, up to 16 logarithms below.
 * @throws RangeError unless x > 0
 */
export function stirlingError(x: number): number {
  if (!(x > 0)) throw new RangeError(`Stirling's formula needs a positive argument, got ${x}`);
  let lifted = 0;
  let argument = x;
  // error(x) = error(x + 1) + (x + 1/2) log(1 + 1/x) - 1, from Gamma(x + 1) = x Gamma(x)
  for (; argument < LARGE; argument++) lifted += (argument + 0.5) * Math.log1p(1 / argument) - 1;
  const inverseSquare = 1 / (argument * argument);
  let series = 0;
  for (let k = SERIES.length - 1; k >= 0; k--) series = series * inverseSquare + SERIES[k]!;
  return lifted + series / argument;
}

/**
 * Natural logarithm of the gamma function for x > 0, to about 1e-15 of its size or of 1, whichever is larger.
 * @throws RangeError unless x > 0
 */
export function logGamma(x: number): number {
  return stirlingError(x) + (x - 0.5) * Math.log(x) - x + HALF_LOG_TWO_PI;
}

// Sine and cosine by the very operations of assembly/lanes.ts, so that the results are the same bits.

/** sin(t) for |t| <= pi/4, w = t^2: Taylor's series to t^15. */
export function smallSine(t: number, w: number): number {
  let s = -1 / 1307674368000;
  s = s * w + 1 / 6227020800;
  s = s * w + -1 / 39916800;
  s = s * w + 1 / 362880;
  s = s * w + -1 / 5040;
  s = s * w + 1 / 120;
  s = s * w + -1 / 6;
  return t + t * (s * w);
}

/** cos(t) for |t| <= pi/4, w = t^2: Taylor's series to t^16. */
export function smallCosine(w: number): number {
  let c = 1 / 20922789888000;
  c = c * w + -1 / 87178291200;
  c = c * w + 1 / 479001600;
  c = c * w + -1 / 3628800;
  c = c * w + 1 / 40320;
  c = c * w + -1 / 720;
  c = c * w + 1 / 24;
  c = c * w + -0.5;
  return c * w + 1;
}

/** Added to a number and subtracted again, it rounds to the nearest whole number: 1.5 2^52. */
const ROUNDER = 6755399441055744;
/** pi/2 in two parts, exact to 1e-16 for up to some hundred quarter turns. */
const QUARTER = 1.5707963267341256;
const QUARTER_REST = 6.077100506506192e-11;

/** sin(x + more pi/2) for |x| < 1000. */
function sineWithQuarters(x: number, more: number): number {
  const quarters = x * 0.6366197723675814 + ROUNDER - ROUNDER;
  const t = x - quarters * QUARTER - quarters * QUARTER_REST;
  const w = t * t;
  const turn = quarters + more;
  const value = (turn & 1) === 1 ? smallCosine(w) : smallSine(t, w);
  return (turn & 2) === 2 ? -value : value;
}

/** sin(x) for |x| < 1000, to about 2e-16. */
export function twinSine(x: number): number {
  return sineWithQuarters(x, 0);
}

/** cos(x) for |x| < 1000, to about 2e-16. */
export function twinCosine(x: number): number {
  return sineWithQuarters(x, 1);
}

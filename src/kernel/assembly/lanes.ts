// Two trials side by side: every 128-bit value holds a number of one trial in its first lane and the same
// number of the next trial in its second.

@inline export function both(x: f64): v128 { return f64x2.splat(x); }
@inline export function add(a: v128, b: v128): v128 { return f64x2.add(a, b); }
@inline export function subtract(a: v128, b: v128): v128 { return f64x2.sub(a, b); }
@inline export function multiply(a: v128, b: v128): v128 { return f64x2.mul(a, b); }
@inline export function divide(a: v128, b: v128): v128 { return f64x2.div(a, b); }
@inline export function root(a: v128): v128 { return f64x2.sqrt(a); }

/** Real part of (a + i b)(c + i d). */
@inline export function productRe(a: v128, b: v128, c: v128, d: v128): v128 {
  return f64x2.sub(f64x2.mul(a, c), f64x2.mul(b, d));
}
/** Imaginary part of (a + i b)(c + i d). */
@inline export function productIm(a: v128, b: v128, c: v128, d: v128): v128 {
  return f64x2.add(f64x2.mul(a, d), f64x2.mul(b, c));
}
/** Real part of (a + i b) times the conjugate of (c + i d). */
@inline export function overlapRe(a: v128, b: v128, c: v128, d: v128): v128 {
  return f64x2.add(f64x2.mul(a, c), f64x2.mul(b, d));
}
/** Imaginary part of (a + i b) times the conjugate of (c + i d). */
@inline export function overlapIm(a: v128, b: v128, c: v128, d: v128): v128 {
  return f64x2.sub(f64x2.mul(b, c), f64x2.mul(a, d));
}
/** |a + i b|^2 */
@inline export function square(a: v128, b: v128): v128 {
  return f64x2.add(f64x2.mul(a, a), f64x2.mul(b, b));
}

/** sin(t), |t| <= pi/4, w = t^2: Taylor's series to t^15. */
@inline export function smallSine(t: v128, w: v128): v128 {
  let s = both(-1.0 / 1307674368000.0);
  s = add(multiply(s, w), both(1.0 / 6227020800.0));
  s = add(multiply(s, w), both(-1.0 / 39916800.0));
  s = add(multiply(s, w), both(1.0 / 362880.0));
  s = add(multiply(s, w), both(-1.0 / 5040.0));
  s = add(multiply(s, w), both(1.0 / 120.0));
  s = add(multiply(s, w), both(-1.0 / 6.0));
  return add(t, multiply(t, multiply(s, w)));
}
/** cos(t), |t| <= pi/4, w = t^2: Taylor's series to t^16. */
@inline export function smallCosine(w: v128): v128 {
  let c = both(1.0 / 20922789888000.0);
  c = add(multiply(c, w), both(-1.0 / 87178291200.0));
  c = add(multiply(c, w), both(1.0 / 479001600.0));
  c = add(multiply(c, w), both(-1.0 / 3628800.0));
  c = add(multiply(c, w), both(1.0 / 40320.0));
  c = add(multiply(c, w), both(-1.0 / 720.0));
  c = add(multiply(c, w), both(1.0 / 24.0));
  c = add(multiply(c, w), both(-0.5));
  return add(multiply(c, w), both(1.0));
}

/** Quarter turns nearest to x as whole numbers, in the low bits of a double near 1.5 2^52. */
@inline function quarters(x: v128): v128 {
  return add(multiply(x, both(0.6366197723675814)), both(6755399441055744.0));
}
/** x less its quarter turns, in [-pi/4, pi/4]; pi/2 in two parts, exact to 1e-16 for |x| < 1000. */
@inline function withoutQuarters(x: v128, count: v128): v128 {
  const n = subtract(count, both(6755399441055744.0));
  return subtract(subtract(x, multiply(n, both(1.5707963267341256))), multiply(n, both(6.077100506506192e-11)));
}
/** sin(x), or cos(x) = sin(x + pi/2) by one quarter turn more. */
@inline function sineWithQuarters(x: v128, more: i64): v128 {
  const count = quarters(x);
  const t = withoutQuarters(x, count);
  const w = multiply(t, t);
  const n = i64x2.add(count, i64x2.splat(more));
  const isCosine = i64x2.shr_s(i64x2.shl(n, 63), 63);
  const sign = v128.and(i64x2.shl(n, 62), i64x2.splat(0x8000000000000000));
  return v128.xor(v128.bitselect(smallCosine(w), smallSine(t, w), isCosine), sign);
}
/** sin(x) for |x| < 1000, to about 2e-16. */
@inline export function sine(x: v128): v128 { return sineWithQuarters(x, 0); }
/** cos(x) for |x| < 1000, to about 2e-16. */
@inline export function cosine(x: v128): v128 { return sineWithQuarters(x, 1); }

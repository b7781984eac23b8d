// Normal random numbers, two at a time: xoroshiro128+ (Blackman and Vigna, ACM Trans. Math. Softw. 47, 36 (2021)) in two lanes and
// the transform of Box and Muller (Ann. Math. Stat. 29, 610 (1958)) by polynomials.

@inline function multiply(a: v128, b: v128): v128 { return f64x2.mul(a, b); }
@inline function add(a: v128, b: v128): v128 { return f64x2.add(a, b); }
@inline function both(x: f64): v128 { return f64x2.splat(x); }

/** log(u) of two numbers in (0, 1]: the mantissa is brought to [sqrt(1/2), sqrt(2)), then 2 artanh((m - 1)/(m + 1)). */
@inline function logarithm(u: v128): v128 {
  const shifted = i64x2.sub(u, i64x2.splat(0x3fe6a09e667f3bcd));
  const exponentBits = i64x2.shr_s(shifted, 52);
  const mantissa = i64x2.sub(u, i64x2.shl(exponentBits, 52));
  // An integer below 2^51 becomes a double by putting it into the mantissa of 1.5 2^52.
  const exponent = f64x2.sub(i64x2.add(exponentBits, i64x2.splat(0x4338000000000000)), both(6755399441055744.0));
  const s = f64x2.div(f64x2.sub(mantissa, both(1.0)), add(mantissa, both(1.0)));
  const z = multiply(s, s);
  let series = both(2.0 / 17.0);
  series = add(multiply(series, z), both(2.0 / 15.0));
  series = add(multiply(series, z), both(2.0 / 13.0));
  series = add(multiply(series, z), both(2.0 / 11.0));
  series = add(multiply(series, z), both(2.0 / 9.0));
  series = add(multiply(series, z), both(2.0 / 7.0));
  series = add(multiply(series, z), both(2.0 / 5.0));
  series = add(multiply(series, z), both(2.0 / 3.0));
  series = add(multiply(series, z), both(2.0));
  return add(multiply(exponent, both(0.6931471805599453)), multiply(s, series));
}

/**
 * Writes `count` (even) normals of mean 0 and standard deviation 1 times `scale` at `out` (16-byte aligned). `state` holds 32 bytes: the first
 * words of both lanes, then the second ones; it is moved on. Normals 4k .. 4k+3 are the cosine halves of both lanes, then the sine halves.
 */
export function fillNormals(out: usize, count: i32, state: usize): void {
  let s0 = v128.load(state);
  let s1 = v128.load(state, 16);
  const mantissaOfOne = i64x2.splat(0x3ff0000000000000);
  for (let k = 0; k < count; k += 4) {
    const first = i64x2.add(s0, s1);
    s1 = v128.xor(s1, s0);
    s0 = v128.xor(v128.xor(v128.or(i64x2.shl(s0, 24), i64x2.shr_u(s0, 40)), s1), i64x2.shl(s1, 16));
    s1 = v128.or(i64x2.shl(s1, 37), i64x2.shr_u(s1, 27));
    const second = i64x2.add(s0, s1);
    s1 = v128.xor(s1, s0);
    s0 = v128.xor(v128.xor(v128.or(i64x2.shl(s0, 24), i64x2.shr_u(s0, 40)), s1), i64x2.shl(s1, 16));
    s1 = v128.or(i64x2.shl(s1, 37), i64x2.shr_u(s1, 27));

    const u = f64x2.sub(both(2.0), v128.or(i64x2.shr_u(first, 12), mantissaOfOne));
    const radius = f64x2.sqrt(multiply(logarithm(u), both(-2.0)));
    // The angle within an eighth of a turn around 0; the lowest, weakest bits of xoroshiro128+ are not used: bits 9 to 11 choose the octant pair and signs.
    const t = multiply(
      f64x2.sub(v128.or(i64x2.shr_u(second, 12), mantissaOfOne), both(1.5)),
      both(1.5707963267948966),
    );
    const w = multiply(t, t);
    let sine = both(1.0 / 6227020800.0);
    sine = add(multiply(sine, w), both(-1.0 / 39916800.0));
    sine = add(multiply(sine, w), both(1.0 / 362880.0));
    sine = add(multiply(sine, w), both(-1.0 / 5040.0));
    sine = add(multiply(sine, w), both(1.0 / 120.0));
    sine = add(multiply(sine, w), both(-1.0 / 6.0));
    sine = multiply(t, add(multiply(sine, w), both(1.0)));
    let cosine = both(-1.0 / 87178291200.0);
    cosine = add(multiply(cosine, w), both(1.0 / 479001600.0));
    cosine = add(multiply(cosine, w), both(-1.0 / 3628800.0));
    cosine = add(multiply(cosine, w), both(1.0 / 40320.0));
    cosine = add(multiply(cosine, w), both(-1.0 / 720.0));
    cosine = add(multiply(cosine, w), both(1.0 / 24.0));
    cosine = add(multiply(cosine, w), both(-0.5));
    cosine = add(multiply(cosine, w), both(1.0));
    const swap = i64x2.shr_s(i64x2.shl(second, 52), 63);
    const signBit = i64x2.splat(0x8000000000000000);
    const a = v128.bitselect(sine, cosine, swap);
    const b = v128.bitselect(cosine, sine, swap);
    v128.store(out, multiply(radius, v128.xor(a, v128.and(i64x2.shl(second, 53), signBit))));
    v128.store(out, multiply(radius, v128.xor(b, v128.and(i64x2.shl(second, 54), signBit))), 16);
    out += 32;
  }
  v128.store(state, s0);
  v128.store(state, s1, 16);
}

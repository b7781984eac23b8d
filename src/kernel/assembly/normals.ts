// The random numbers of two trials. Philox4x32-10 (Salmon, Moraes, Dror, Shaw, SC'11) gives each trial its starting state, so that a trial has the same numbers
// whoever runs it; from there on xoroshiro128+ (Blackman and Vigna, ACM Trans. Math. Softw. 47, 36 (2021)) and the transform of Box and
// Muller (Ann. Math. Stat. 29, 610 (1958)).

import { add, both, divide, multiply, root, smallCosine, smallSine, subtract } from './lanes';

/** Writes the state of trial `trial` into one lane of the 32 bytes at `state`: the counter is [0, 0, trial, stream], the key the seed. */
export function seedTrial(state: usize, lane: i32, seedLow: u32, seedHigh: u32, stream: u32, trial: u32): void {
  let c0: u32 = 0;
  let c1: u32 = 0;
  let c2 = trial;
  let c3 = stream;
  let k0 = seedLow;
  let k1 = seedHigh;
  for (let round = 0; round < 10; round++) {
    const p0 = u64(c0) * 0xd2511f53;
    const p1 = u64(c2) * 0xcd9e8d57;
    c0 = u32(p1 >> 32) ^ c1 ^ k0;
    c1 = u32(p1);
    c2 = u32(p0 >> 32) ^ c3 ^ k1;
    c3 = u32(p0);
    k0 += 0x9e3779b9;
    k1 += 0xbb67ae85;
  }
  const at = state + usize(lane) * 8;
  store<u64>(at, u64(c0) | (u64(c1) << 32));
  store<u64>(at, u64(c2) | (u64(c3) << 32), 16);
}

/** log(u) of numbers in (0, 1]: the mantissa is brought to [sqrt(1/2), sqrt(2)), then 2 artanh((m - 1)/(m + 1)). */
@inline function logarithm(u: v128): v128 {
  const shifted = i64x2.sub(u, i64x2.splat(0x3fe6a09e667f3bcd));
  const exponentBits = i64x2.shr_s(shifted, 52);
  const mantissa = i64x2.sub(u, i64x2.shl(exponentBits, 52));
  // A whole number below 2^51 becomes a double in the mantissa of 1.5 2^52.
  const exponent = subtract(i64x2.add(exponentBits, i64x2.splat(0x4338000000000000)), both(6755399441055744.0));
  const s = divide(subtract(mantissa, both(1.0)), add(mantissa, both(1.0)));
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

@inline function rotateLeft(x: v128, bits: i32): v128 {
  return v128.or(i64x2.shl(x, bits), i64x2.shr_u(x, 64 - bits));
}
/** A double in [1, 2) from the upper 52 bits. */
@inline function mantissaOf(bits: v128): v128 {
  return v128.or(i64x2.shr_u(bits, 12), i64x2.splat(0x3ff0000000000000));
}
@inline function nextFirst(s0: v128, s1: v128): v128 {
  return v128.xor(v128.xor(rotateLeft(s0, 24), s1), i64x2.shl(s1, 16));
}

/**
 * Writes `count` normals of mean 0 and standard deviation 1 for each lane, an even number, 16 bytes each, at `out`. `state` is moved on.
 */
export function fillNormals(out: usize, count: i32, state: usize): void {
  let s0 = v128.load(state);
  let s1 = v128.load(state, 16);
  for (let k = 0; k < count; k += 2) {
    const first = i64x2.add(s0, s1);
    s1 = v128.xor(s1, s0);
    s0 = nextFirst(s0, s1);
    s1 = rotateLeft(s1, 37);
    const second = i64x2.add(s0, s1);
    s1 = v128.xor(s1, s0);
    s0 = nextFirst(s0, s1);
    s1 = rotateLeft(s1, 37);

    const radius = root(multiply(logarithm(subtract(both(2.0), mantissaOf(first))), both(-2.0)));
    // The angle within an eighth of a turn around 0 from the upper 52 bits; bits 9 to 11 choose the octants (the lowest bits of xoroshiro128+ are weak).
    const t = multiply(subtract(mantissaOf(second), both(1.5)), both(1.5707963267948966));
    const w = multiply(t, t);
    const s = smallSine(t, w);
    const c = smallCosine(w);
    const swap = i64x2.shr_s(i64x2.shl(second, 52), 63);
    const signBit = i64x2.splat(0x8000000000000000);
    const a = v128.xor(v128.bitselect(s, c, swap), v128.and(i64x2.shl(second, 53), signBit));
    const b = v128.xor(v128.bitselect(c, s, swap), v128.and(i64x2.shl(second, 54), signBit));
    v128.store(out, multiply(radius, a));
    v128.store(out, multiply(radius, b), 16);
    out += 32;
  }
  v128.store(state, s0);
  v128.store(state, s1, 16);
}

/** Writes `count` numbers for each lane, uniform with mean 0 and standard deviation 1: between -sqrt(3) and sqrt(3). */
export function fillUniforms(out: usize, count: i32, state: usize): void {
  let s0 = v128.load(state);
  let s1 = v128.load(state, 16);
  for (let k = 0; k < count; k++) {
    const bits = i64x2.add(s0, s1);
    s1 = v128.xor(s1, s0);
    s0 = nextFirst(s0, s1);
    s1 = rotateLeft(s1, 37);
    v128.store(out, multiply(subtract(mantissaOf(bits), both(1.5)), both(3.4641016151377544)));
    out += 16;
  }
  v128.store(state, s0);
  v128.store(state, s1, 16);
}

// The random numbers of two trials. Philox4x32-10 (Salmon, Moraes, Dror, Shaw, SC'11) gives each trial its
// starting state, so that a trial has the same numbers whoever runs it; from there on xoroshiro128+ (Blackman
// and Vigna, ACM Trans. Math. Softw. 47, 36 (2021)), a stream of its own in each lane.

/**
 * Writes the states of trials `trial` and `trial + 1` into the two lanes of the 32 bytes at `state`: counters
 * [0, 0, trial, stream], the key the seed.
 */
export function seedTrials(state: usize, seedLow: u32, seedHigh: u32, stream: u32, trial: u32): void {
  seedLane(state, seedLow, seedHigh, stream, trial);
  seedLane(state + 8, seedLow, seedHigh, stream, trial + 1);
}

function seedLane(at: usize, seedLow: u32, seedHigh: u32, stream: u32, trial: u32): void {
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
  store<u64>(at, u64(c0) | (u64(c1) << 32));
  store<u64>(at, u64(c2) | (u64(c3) << 32), 16);
}

@inline function nextFirst(s0: u64, s1: u64): u64 {
  return rotl(s0, 24) ^ s1 ^ (s1 << 16);
}
/** A double in [1, 2) from the upper 52 bits. */
@inline function mantissaOf(bits: u64): f64 {
  return reinterpret<f64>((bits >> 12) | 0x3ff0000000000000);
}

/**
 * log(u) for u in (0, 1]: the mantissa is brought to [sqrt(1/2), sqrt(2)), then 2 artanh((m - 1)/(m + 1)).
 */
function logarithm(u: f64): f64 {
  const bits = reinterpret<i64>(u);
  const exponent = (bits - 0x3fe6a09e667f3bcd) >> 52;
  const mantissa = reinterpret<f64>(bits - (exponent << 52));
  const s = (mantissa - 1.0) / (mantissa + 1.0);
  const z = s * s;
  let series = 2.0 / 17.0;
  for (let odd = 15; odd >= 1; odd -= 2) series = series * z + 2.0 / f64(odd);
  return f64(exponent) * 0.6931471805599453 + s * series;
}

/**
 * e^x for x in [-30, 0]: by powers of 2, the rest by Taylor's series to the 13th power, its even and its odd
 * terms beside each other, which the processor can do at the same time.
 */
function exponential(x: f64): f64 {
  const power = nearest(x * 1.4426950408889634);
  const rest = x - power * 0.6931471805599453;
  const square = rest * rest;
  let even = 1.0 / 479001600.0;
  even = even * square + 1.0 / 3628800.0;
  even = even * square + 1.0 / 40320.0;
  even = even * square + 1.0 / 720.0;
  even = even * square + 1.0 / 24.0;
  even = even * square + 0.5;
  even = even * square + 1.0;
  let odd = 1.0 / 6227020800.0;
  odd = odd * square + 1.0 / 39916800.0;
  odd = odd * square + 1.0 / 362880.0;
  odd = odd * square + 1.0 / 5040.0;
  odd = odd * square + 1.0 / 120.0;
  odd = odd * square + 1.0 / 6.0;
  odd = odd * square + 1.0;
  return (even + odd * rest) * reinterpret<f64>((i64(power) + 1023) << 52);
}

/** Bytes of a layer in the tables: its right edge, the next edge as a share of it. */
const LAYER = 16;
/** Where the densities at the edges begin in the tables, 8 bytes each. */
const DENSITIES = 513 * LAYER;

// The state of the lane at work, for the numbers that need more than one word.
let first: u64 = 0;
let second: u64 = 0;

/** Bits 4 to 12 choose the layer: already the distance of the layer in the tables. */
@inline function layerOf(bits: u64, layers: usize): usize {
  return layers + usize(bits & 0x1ff0);
}

@inline function nextBits(): u64 {
  const bits = first + second;
  second ^= first;
  first = nextFirst(first, second);
  second = rotl(second, 37);
  return bits;
}

@inline function rotatedLeft(words: v128, by: i32): v128 {
  return v128.or(i64x2.shl(words, by), i64x2.shr_u(words, 64 - by));
}

/**
 * Writes `count` normals of mean 0 and standard deviation 1 for each lane, 16 bytes each, at `out`; `state`
 * is moved on. By the ziggurat of Marsaglia and Tsang, J. Stat. Softw. 5, 8 (2000), with 512 layers: 99.4
 * of 100 numbers cost one random word, one product and one comparison, for both lanes at once. The upper 52
 * bits of a word place the number, bits 4 to 12 choose its layer (the lowest bits of xoroshiro128+ are weak;
 * bit 12 moves the number by 2^-52 of its layer only).
 */
export function fillNormals(out: usize, count: i32, state: usize, layers: usize): void {
  let s0 = v128.load(state);
  let s1 = v128.load(state, 16);
  const end = out + usize(count) * 16;
  for (let at = out; at < end; at += 16) {
    const bits = i64x2.add(s0, s1);
    const mixed = v128.xor(s0, s1);
    s0 = v128.xor(v128.xor(rotatedLeft(s0, 24), mixed), i64x2.shl(mixed, 16));
    s1 = rotatedLeft(mixed, 37);
    const mantissas = v128.or(i64x2.shr_u(bits, 12), i64x2.splat(0x3ff0000000000000));
    const u = f64x2.sub(f64x2.mul(f64x2.splat(2.0), mantissas), f64x2.splat(3.0));
    const distances = v128.and(bits, i64x2.splat(0x1ff0));
    const layer0 = v128.load(layers + usize(i32x4.extract_lane(distances, 0)));
    const layer1 = v128.load(layers + usize(i32x4.extract_lane(distances, 2)));
    v128.store(at, f64x2.mul(u, v128.shuffle<f64>(layer0, layer1, 0, 2)));
    const inside = i64x2.bitmask(f64x2.lt(f64x2.abs(u), v128.shuffle<f64>(layer0, layer1, 1, 3)));
    if (inside != 3) {
      v128.store(state, s0);
      v128.store(state, s1, 16);
      if (!(inside & 1)) atTheEdge(at, i64x2.extract_lane(bits, 0), state, layers);
      if (!(inside & 2)) atTheEdge(at + 8, i64x2.extract_lane(bits, 1), state + 8, layers);
      s0 = v128.load(state);
      s1 = v128.load(state, 16);
    }
  }
  v128.store(state, s0);
  v128.store(state, s1, 16);
}

/**
 * Writes the number of one lane whose word placed it beyond the next layer's edge: in the tail, under the
 * density, or, after all, a new one. The lane's state is moved on.
 */
function atTheEdge(out: usize, bits: u64, state: usize, layers: usize): void {
  first = load<u64>(state);
  second = load<u64>(state, 16);
  store<f64>(out, normalFrom(bits, layers));
  store<u64>(state, first);
  store<u64>(state, second, 16);
}

function normalFrom(bits: u64, layers: usize): f64 {
  while (true) {
    const u = 2.0 * mantissaOf(bits) - 3.0;
    const layer = layerOf(bits, layers);
    const x = u * load<f64>(layer);
    if (abs(u) < load<f64>(layer, 8)) return x;
    if (layer == layers) return u < 0.0 ? -tail(load<f64>(layers, LAYER)) : tail(load<f64>(layers, LAYER));
    const densities = layers + DENSITIES + ((layer - layers) >> 1);
    const low = load<f64>(densities);
    const high = load<f64>(densities, 8);
    if (low + (mantissaOf(nextBits()) - 1.0) * (high - low) < exponential(-0.5 * x * x)) return x;
    bits = nextBits();
  }
}

/** A normal number beyond `edge`: Marsaglia, Technometrics 6, 101 (1964). */
function tail(edge: f64): f64 {
  while (true) {
    const x = logarithm(2.0 - mantissaOf(nextBits())) / edge;
    const y = logarithm(2.0 - mantissaOf(nextBits()));
    if (-2.0 * y >= x * x) return edge - x;
  }
}

/**
 * Writes `count` numbers for each lane, uniform with mean 0 and standard deviation 1: between -sqrt(3) and
 * sqrt(3).
 */
export function fillUniforms(out: usize, count: i32, state: usize): void {
  for (let lane: usize = 0; lane < 16; lane += 8) {
    first = load<u64>(state + lane);
    second = load<u64>(state + lane, 16);
    const end = out + lane + usize(count) * 16;
    for (let at = out + lane; at < end; at += 16) {
      store<f64>(at, (mantissaOf(nextBits()) - 1.5) * 3.4641016151377544);
    }
    store<u64>(state + lane, first);
    store<u64>(state + lane, second, 16);
  }
}

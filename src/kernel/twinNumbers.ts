import type { Kernels } from './loadKernels.js';
import type { TwinMemory } from './twinMemory.js';
import { LANES } from './twinMemory.js';
import { DENSITIES_AT } from './ziggurat.js';

const WORD = 0xffffffffn;

/**
 * The two 64-bit words that Philox4x32-10 (Salmon, Moraes, Dror, Shaw, SC'11) makes of the counter [0, 0,
 * trial, stream] and the seed.
 */
function philoxWords(seed: readonly [bigint, bigint], stream: bigint, trial: bigint): [bigint, bigint] {
  let [c0, c1, c2, c3] = [0n, 0n, trial, stream];
  let [k0, k1] = seed;
  for (let round = 0; round < 10; round++) {
    const p0 = c0 * 0xd2511f53n;
    const p1 = c2 * 0xcd9e8d57n;
    [c0, c1, c2, c3] = [(p1 >> 32n) ^ c1 ^ k0, p1 & WORD, (p0 >> 32n) ^ c3 ^ k1, p0 & WORD];
    k0 = (k0 + 0x9e3779b9n) & WORD;
    k1 = (k1 + 0xbb67ae85n) & WORD;
  }
  return [c0 | (c1 << 32n), c2 | (c3 << 32n)];
}

const wrap = (bits: bigint): bigint => BigInt.asUintN(64, bits);
const rotateLeft = (bits: bigint, by: bigint): bigint => wrap(bits << by) | (bits >> (64n - by));

/**
 * xoroshiro128+ of Blackman and Vigna, ACM Trans. Math. Softw. 47, 36 (2021), on the state of one lane: the
 * next 64 bits.
 */
function nextBits(words: BigUint64Array, at: number): bigint {
  const first = words[at]!;
  const second = words[at + LANES]!;
  const mixed = first ^ second;
  words[at] = rotateLeft(first, 24n) ^ mixed ^ wrap(mixed << 16n);
  words[at + LANES] = rotateLeft(mixed, 37n);
  return wrap(first + second);
}

/** A double in [1, 2) from the upper 52 bits. */
const mantissaOf = (bits: bigint): number => 1 + Number(bits >> 12n) * 2 ** -52;

const exchange = new DataView(new ArrayBuffer(8));
/** Bits of sqrt(1/2). */
const ROOT_HALF = 0x3fe6a09e667f3bcdn;

/**
 * log(u) for u in (0, 1]: the mantissa is brought to [sqrt(1/2), sqrt(2)), then 2 artanh((m - 1)/(m + 1)).
 */
function logarithm(u: number): number {
  exchange.setFloat64(0, u);
  const bits = exchange.getBigInt64(0);
  const exponent = (bits - ROOT_HALF) >> 52n;
  exchange.setBigInt64(0, bits - (exponent << 52n));
  const mantissa = exchange.getFloat64(0);
  const s = (mantissa - 1) / (mantissa + 1);
  const z = s * s;
  let series = 2 / 17;
  for (let odd = 15; odd >= 1; odd -= 2) series = series * z + 2 / odd;
  return Number(exponent) * 0.6931471805599453 + s * series;
}

/** Of Taylor's series of e^x to the 13th power: the factors of even and of odd powers, highest first. */
const EVEN = [479001600, 3628800, 40320, 720, 24, 2, 1].map((factorial) => 1 / factorial);
const ODD = [6227020800, 39916800, 362880, 5040, 120, 6, 1].map((factorial) => 1 / factorial);

/** e^x for x in [-30, 0]: by powers of 2, the rest by Taylor's series. */
function exponential(x: number): number {
  // Halves do not occur, so rounding to the nearest whole number needs no rule for them.
  const power = Math.round(x * 1.4426950408889634);
  const rest = x - power * 0.6931471805599453;
  const square = rest * rest;
  const horner = (factors: readonly number[]): number =>
    factors.reduce((sum, factor) => sum * square + factor);
  return (horner(EVEN) + horner(ODD) * rest) * 2 ** power;
}

/** Doubles of a layer in the tables of ziggurat.ts. */
const LAYER = 2;

/** Draws normals from one lane: the ziggurat of assembly/normals.ts. */
function createNormals({ doubles, words }: TwinMemory, at: number, layers: number): () => number {
  const uniform = (): number => mantissaOf(nextBits(words, at)) - 1;
  const tail = (edge: number): number => {
    for (;;) {
      const x = logarithm(1 - uniform()) / edge;
      const y = logarithm(1 - uniform());
      if (-2 * y >= x * x) return edge - x;
    }
  };
  return () => {
    for (;;) {
      const bits = nextBits(words, at);
      const u = 2 * mantissaOf(bits) - 3;
      const index = Number((bits >> 4n) & 511n);
      const layer = layers + index * LAYER;
      const x = u * doubles[layer]!;
      if (Math.abs(u) < doubles[layer + 1]!) return x;
      if (index === 0) return u < 0 ? -tail(doubles[layers + LAYER]!) : tail(doubles[layers + LAYER]!);
      const [low, high] = [
        doubles[layers + DENSITIES_AT + index]!,
        doubles[layers + DENSITIES_AT + index + 1]!,
      ];
      if (low + uniform() * (high - low) < exponential(-0.5 * x * x)) return x;
    }
  };
}

/** Twins of assembly/normals.ts. */
export function twinNumbers(
  memory: () => TwinMemory,
): Pick<Kernels, 'seedTrials' | 'fillNormals' | 'fillUniforms'> {
  return {
    seedTrials: (state, seedLow, seedHigh, stream, first) => {
      const word = (value: number): bigint => BigInt.asUintN(32, BigInt(value));
      const seed = [word(seedLow), word(seedHigh)] as const;
      const { words } = memory();
      for (let lane = 0; lane < LANES; lane++) {
        const [low, high] = philoxWords(seed, word(stream), word(first + lane));
        words[state / 8 + lane] = low;
        words[state / 8 + LANES + lane] = high;
      }
    },
    fillNormals: (out, count, state, layers) => {
      const { doubles } = memory();
      for (let lane = 0; lane < LANES; lane++) {
        const normal = createNormals(memory(), state / 8 + lane, layers / 8);
        for (let k = 0; k < count; k++) doubles[out / 8 + LANES * k + lane] = normal();
      }
    },
    fillUniforms: (out, count, state) => {
      const { doubles, words } = memory();
      for (let lane = 0; lane < LANES; lane++) {
        for (let k = 0; k < count; k++) {
          const bits = nextBits(words, state / 8 + lane);
          doubles[out / 8 + LANES * k + lane] = (mantissaOf(bits) - 1.5) * 3.4641016151377544;
        }
      }
    },
  };
}

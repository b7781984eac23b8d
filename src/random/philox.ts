const MULTIPLIER_0 = 0xd2511f53;
const MULTIPLIER_1 = 0xcd9e8d57;
const KEY_STEP_0 = 0x9e3779b9; // golden ratio
const KEY_STEP_1 = 0xbb67ae85; // sqrt(3) - 1
const ROUNDS = 10;

/**
 * Philox4x32-10: 128 pseudo-random bits as a pure function of a counter (four 32-bit words) and a key
 * (two). `out` is overwritten and may be `counter` itself. Two different counters under one key never give
 * the same block.
 *
 * Source: Salmon, Moraes, Dror, Shaw, "Parallel random numbers: as easy as 1, 2, 3", SC'11,
 * doi:10.1145/2063384.2063405, section 3.3.
 */
export function philox4x32(counter: Uint32Array, key: Uint32Array, out: Uint32Array): void {
  let c0 = counter[0]!;
  let c1 = counter[1]!;
  let c2 = counter[2]!;
  let c3 = counter[3]!;
  let k0 = key[0]!;
  let k1 = key[1]!;
  for (let round = 0; round < ROUNDS; round++) {
    const high0 = highWord(c0, MULTIPLIER_0);
    const low0 = Math.imul(c0, MULTIPLIER_0);
    const high1 = highWord(c2, MULTIPLIER_1);
    const low1 = Math.imul(c2, MULTIPLIER_1);
    c0 = (high1 ^ c1 ^ k0) >>> 0;
    c1 = low1 >>> 0;
    c2 = (high0 ^ c3 ^ k1) >>> 0;
    c3 = low0 >>> 0;
    k0 = (k0 + KEY_STEP_0) >>> 0;
    k1 = (k1 + KEY_STEP_1) >>> 0;
  }
  out[0] = c0;
  out[1] = c1;
  out[2] = c2;
  out[3] = c3;
}

/** Upper 32 bits of the 64-bit product of two 32-bit words: long multiplication in halves of 16 bits. */
function highWord(a: number, b: number): number {
  const aLow = a & 0xffff;
  const aHigh = a >>> 16;
  const bLow = b & 0xffff;
  const bHigh = b >>> 16;
  // Both sums reach at most (2^16 - 1)^2 + 2^16 - 1 < 2^32, and so does the result.
  const first = (Math.imul(aHigh, bLow) >>> 0) + (Math.imul(aLow, bLow) >>> 16);
  const second = (Math.imul(aLow, bHigh) >>> 0) + (first & 0xffff);
  return Math.imul(aHigh, bHigh) + (first >>> 16) + (second >>> 16);
}

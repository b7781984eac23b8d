import { describe, expect, it } from 'vitest';
import { philox4x32 } from '../../src/random/philox.js';

function block(counter: readonly number[], key: readonly number[]): number[] {
  const out = new Uint32Array(4);
  philox4x32(Uint32Array.from(counter), Uint32Array.from(key), out);
  return [...out];
}

/**
 * The definition (Salmon et al., SC'11, section 3.3) in whole numbers of any size: slow, and with nothing
 * to overflow.
 */
function blockByBigInt(counter: readonly number[], key: readonly number[]): number[] {
  const mask = 0xffffffffn;
  let [a, b, c, d] = counter.map(BigInt) as [bigint, bigint, bigint, bigint];
  let [k, l] = key.map(BigInt) as [bigint, bigint];
  for (let round = 0; round < 10; round++) {
    const p = a * 0xd2511f53n;
    const q = c * 0xcd9e8d57n;
    [a, b, c, d] = [(q >> 32n) ^ b ^ k, q & mask, (p >> 32n) ^ d ^ l, p & mask];
    k = (k + 0x9e3779b9n) & mask;
    l = (l + 0xbb67ae85n) & mask;
  }
  return [a, b, c, d].map(Number);
}

describe('philox4x32', () => {
  // Known answers of the generator's authors, from memory.
  it.each([
    [[0, 0, 0, 0], [0, 0], '6627e8d5 e169c58d bc57ac4c 9b00dbd8'],
    [Array<number>(4).fill(0xffffffff), [0xffffffff, 0xffffffff], '408f276d 41c83b0e a20bc7c6 6d5451fd'],
    // Counter and key: the first digits of pi in base 16.
    [
      [0x243f6a88, 0x85a308d3, 0x13198a2e, 0x03707344],
      [0xa4093822, 0x299f31d0],
      'd16cfe09 94fdcceb 5001e420 24126ea1',
    ],
  ])('gives the known answer for counter %j and key %j', (counter, key, answer) => {
    const words = block(counter, key).map((word) => word.toString(16).padStart(8, '0'));
    expect(words.join(' ')).toBe(answer);
  });

  it('agrees with its definition in whole numbers of any size', () => {
    const edges = [0, 1, 0xffff, 0x10000, 0x7fffffff, 0x80000000, 0xffff0000, 0xffffffff];
    for (let k = 0; k < 2000; k++) {
      const words = Array.from({ length: 6 }, (_, w) => {
        const pick = Math.imul(k * 6 + w + 1, 0x9e3779b1) >>> 0;
        return pick % 3 === 0 ? edges[pick % 8]! : pick;
      });
      const counter = words.slice(0, 4);
      const key = words.slice(4);
      expect(block(counter, key)).toEqual(blockByBigInt(counter, key));
    }
  });

  it('may write over its own counter', () => {
    const counter = Uint32Array.of(1, 2, 3, 4);
    philox4x32(counter, Uint32Array.of(5, 6), counter);
    expect([...counter]).toEqual(block([1, 2, 3, 4], [5, 6]));
  });
});

import { philox4x32 } from './philox.js';

const WORD = 2 ** 32;
const LARGEST_WORD = WORD - 1;

/** A source of random numbers that no other stream, trial or seed shares. */
export interface RandomStream {
  /** Uniform in [0, 1), a multiple of 2^-53. */
  uniform(): number;
  /** Normal with mean 0 and standard deviation 1. */
  normal(): number;
}

/**
 * The random numbers of one (seed, stream, trial). They depend on these three and on nothing else, so a
 * trial has the same numbers whichever worker runs it and in whatever order; neighbouring seeds, streams
 * and trials are independent. A purpose has its stream number in `STREAMS`; a trial is one sampled chip.
 *
 * Philox4x32-10 with the two halves of the seed as its key and [block, block, trial, stream] as its
 * counter; 2^65 uniform numbers in each. Normals by Marsaglia and Bray's polar method (SIAM Rev. 6, 260
 * (1964)), which needs only the logarithm and the square root; they come in pairs, the second of which is
 * kept for the next call.
 *
 * @param seed whole number from 0 to 2^53 - 1
 * @param stream whole number from 0 to 2^32 - 1
 * @param trial whole number from 0 to 2^32 - 1
 * @throws RangeError when one of them is not
 */
export function randomStream(seed: number, stream: number, trial = 0): RandomStream {
  requireWhole('seed', seed, Number.MAX_SAFE_INTEGER);
  requireWhole('stream', stream, LARGEST_WORD);
  requireWhole('trial', trial, LARGEST_WORD);
  return new PhiloxStream(
    new Uint32Array([seed % WORD, Math.floor(seed / WORD)]),
    new Uint32Array([0, 0, trial, stream]),
  );
}

class PhiloxStream implements RandomStream {
  readonly #key: Uint32Array;
  readonly #counter: Uint32Array;
  readonly #block = new Uint32Array(4);
  #used = 4;
  #spareNormal = NaN;

  constructor(key: Uint32Array, counter: Uint32Array) {
    this.#key = key;
    this.#counter = counter;
  }

  uniform(): number {
    if (this.#used === 4) this.#nextBlock();
    const high = this.#block[this.#used]! >>> 5;
    const low = this.#block[this.#used + 1]! >>> 6;
    this.#used += 2;
    return (high * 2 ** 26 + low) * 2 ** -53;
  }

  normal(): number {
    const spare = this.#spareNormal;
    if (!Number.isNaN(spare)) {
      this.#spareNormal = NaN;
      return spare;
    }
    for (;;) {
      const x = 2 * this.uniform() - 1;
      const y = 2 * this.uniform() - 1;
      const square = x * x + y * y;
      if (square >= 1 || square === 0) continue;
      const scale = Math.sqrt((-2 * Math.log(square)) / square);
      this.#spareNormal = y * scale;
      return x * scale;
    }
  }

  #nextBlock(): void {
    philox4x32(this.#counter, this.#key, this.#block);
    this.#counter[0]!++;
    if (this.#counter[0] === 0) this.#counter[1]!++;
    this.#used = 0;
  }
}

function requireWhole(name: string, value: number, largest: number): void {
  if (!(Number.isInteger(value) && value >= 0 && value <= largest)) {
    throw new RangeError(`${name} must be a whole number from 0 to ${largest}, got ${value}`);
  }
}

import { InputError } from '../errors/InputError.js';
import { tooLarge } from './limits.js';

/** Matrices of the largest size that one formula may make on the way, each counted when it is made. */
const LARGEST_MATRICES = 16;
const LEAST_ENTRIES = 1_000_000;

/**
 * Bounds what a formula may allocate: every dimension, every value, and the sum of all values made on the
 * way.
 */
export class SizeBudget {
  private entriesLeft: number;

  constructor(readonly maxModes: number) {
    this.entriesLeft = Math.max(LARGEST_MATRICES * maxModes ** 2, LEAST_ENTRIES);
  }

  /**
   * Asks for an array of this size before it is made.
   * @throws InputError `target/too-large` when one dimension, or the whole, exceeds the limit;
   * `target/too-much-work` when all that was made on the way does.
   */
  spend(sizes: readonly number[]): void {
    this.requireSize(sizes);
    this.entriesLeft -= sizes.reduce((product, size) => product * size, 1);
    if (this.entriesLeft >= 0) return;
    throw new InputError(
      'target/too-much-work',
      'the formula makes too many matrices on the way',
      'Compute the target elsewhere and give it as a file.',
    );
  }

  /** As `spend`, without counting. @throws InputError `target/too-large`. */
  requireSize(sizes: readonly number[]): void {
    const entries = sizes.reduce((product, size) => product * size, 1);
    const fits = sizes.every((size) => size <= this.maxModes) && entries <= this.maxModes ** 2;
    if (!fits) throw tooLarge(sizes.length === 1 ? `${sizes[0]} long` : sizes.join(' x '), this.maxModes);
  }
}

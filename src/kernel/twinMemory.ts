/**
 * The memory that twins work on, seen as numbers of each kind. All views cover the whole of it: index =
 * address / bytes of an element.
 */
export interface TwinMemory {
  readonly doubles: Float64Array;
  readonly integers: Int32Array;
  readonly words: BigUint64Array;
  readonly bytes: Uint8Array;
}

/** The views of a buffer; its length is a multiple of 8 bytes. */
export function twinMemory(buffer: ArrayBuffer): TwinMemory {
  return {
    doubles: new Float64Array(buffer),
    integers: new Int32Array(buffer),
    words: new BigUint64Array(buffer),
    bytes: new Uint8Array(buffer),
  };
}

/** Doubles from a number of one trial to the next number of the same trial: two trials lie side by side. */
export const LANES = 2;

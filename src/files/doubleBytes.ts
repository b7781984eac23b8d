import { endianness } from 'node:os';

const NATIVE_ORDER = endianness() === 'LE';

/**
 * Doubles as little-endian bytes. On machines of that order this is a view of the same memory, not a copy:
 * use it before the values change.
 */
export function littleEndianBytes(values: Float64Array): Uint8Array {
  const bytes = new Uint8Array(values.buffer, values.byteOffset, values.byteLength);
  return NATIVE_ORDER ? bytes : Buffer.from(bytes).swap64();
}

/** `count` doubles from little-endian bytes, the first at index `start`; a copy, bit for bit. */
export function doublesFromBytes(bytes: Uint8Array, start: number, count: number): Float64Array {
  const values = new Float64Array(count);
  const copy = Buffer.from(values.buffer);
  copy.set(bytes.subarray(start, start + 8 * count));
  if (!NATIVE_ORDER) copy.swap64();
  return values;
}

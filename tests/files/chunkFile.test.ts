import { createHash } from 'node:crypto';
import { describe, expect, it } from 'vitest';
import type { Chunk } from '../../src/files/chunkFile.js';
import { decodeChunk, encodeChunk } from '../../src/files/chunkFile.js';

const RUN = 'run-1';
const CHUNK: Chunk = {
  number: 7,
  firstTrial: 601,
  rows: Float64Array.of(0.1, -0, NaN, 5e-324, -Infinity, 1 / 3),
  counters: [3, 2 ** 40],
};
const BYTES = encodeChunk(CHUNK, 3, RUN);
const BODY = BYTES.length - 32;

/** The bytes with a change and a checksum that fits it. */
function forged(change: (bytes: Buffer) => void): Uint8Array {
  const bytes = Buffer.from(BYTES);
  change(bytes);
  createHash('sha256').update(bytes.subarray(0, BODY)).digest().copy(bytes, BODY);
  return bytes;
}

describe('a chunk as a file', () => {
  it('has the layout that its documentation gives', () => {
    const view = new DataView(BYTES.buffer, BYTES.byteOffset, BYTES.length);
    expect(BYTES.length).toBe(56 + 8 * 2 + 8 * 6 + 32);
    expect(Buffer.from(BYTES.subarray(0, 8)).toString('latin1')).toBe('pw-chunk');
    expect([8, 12, 32, 36].map((at) => view.getUint32(at, true))).toEqual([1, 3, 2, 2]);
    expect([16, 24].map((at) => view.getBigUint64(at, true))).toEqual([7n, 601n]);
    expect([56, 64, 72, 80, 112].map((at) => view.getFloat64(at, true))).toEqual([
      3,
      2 ** 40,
      0.1,
      -0,
      1 / 3,
    ]);
    const hash = createHash('sha256').update(BYTES.subarray(0, BODY)).digest();
    expect(hash.equals(BYTES.subarray(BODY))).toBe(true);
  });

  it('comes back bit for bit, from bytes at any place in memory', () => {
    for (const shift of [0, 1, 5]) {
      const moved = new Uint8Array(BYTES.length + shift).subarray(shift);
      moved.set(BYTES);
      expect(decodeChunk(moved, 7, 3, RUN)).toEqual(CHUNK);
    }
    const empty: Chunk = { number: 1, firstTrial: 1, rows: new Float64Array(0), counters: [] };
    expect(decodeChunk(encodeChunk(empty, 4, RUN), 1, 4, RUN)).toEqual(empty);
  });

  it('is damaged when it is cut anywhere or goes on behind its end', () => {
    for (let length = 0; length < BYTES.length; length++) {
      expect(decodeChunk(BYTES.subarray(0, length), 7, 3, RUN), String(length)).toMatchObject({
        fault: 'damaged',
      });
    }
    expect(decodeChunk(Buffer.concat([BYTES, Buffer.alloc(8)]), 7, 3, RUN)).toMatchObject({
      fault: 'damaged',
    });
  });

  it('is damaged when any one bit of it is', () => {
    const found = new Set<unknown>();
    for (let bit = 0; bit < 8 * BYTES.length; bit++) {
      const bytes = Uint8Array.from(BYTES);
      bytes[bit >> 3]! ^= 1 << (bit & 7);
      const chunk = decodeChunk(bytes, 7, 3, RUN);
      found.add('fault' in chunk ? chunk.fault : bit);
    }
    expect([...found]).toEqual(['damaged']);
  });

  it('is foreign when it is whole, but of another run, number, width or version', () => {
    expect(decodeChunk(BYTES, 7, 3, 'run-2')).toMatchObject({ fault: 'foreign' });
    expect(decodeChunk(BYTES, 8, 3, RUN)).toMatchObject({ fault: 'foreign' });
    expect(decodeChunk(BYTES, 7, 2, RUN)).toMatchObject({ fault: 'foreign' });
    expect(
      decodeChunk(
        forged((bytes) => bytes.writeUInt32LE(2, 8)),
        7,
        3,
        RUN,
      ),
    ).toMatchObject({ fault: 'foreign' });
    expect(
      decodeChunk(
        forged((bytes) => bytes.write('x')),
        7,
        3,
        RUN,
      ),
    ).toMatchObject({ fault: 'foreign' });
  });

  it('is damaged when its counts do not fit its length, whatever the checksum says', () => {
    for (const [at, value] of [
      [32, 3],
      [32, 0xffffffff],
      [36, 0],
      [36, 0xffffffff],
    ] as const) {
      expect(
        decodeChunk(
          forged((bytes) => bytes.writeUInt32LE(value, at)),
          7,
          3,
          RUN,
        ),
      ).toMatchObject({
        fault: 'damaged',
      });
    }
  });

  it.each([
    ['uneven rows', { ...CHUNK, rows: new Float64Array(5) }, 3],
    ['number 0', { ...CHUNK, number: 0 }, 3],
    ['number NaN', { ...CHUNK, number: NaN }, 3],
    ['first trial 1.5', { ...CHUNK, firstTrial: 1.5 }, 3],
    ['no columns', CHUNK, 0],
  ])('is not made with %s', (_, chunk, columns) => {
    expect(() => encodeChunk(chunk, columns, RUN)).toThrow(RangeError);
  });
});

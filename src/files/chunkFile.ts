import { createHash } from 'node:crypto';
import { doublesFromBytes, littleEndianBytes } from './doubleBytes.js';

/** A finished piece of a long run. */
export interface Chunk {
  /** Counts from 1. */
  readonly number: number;
  /** Number of the trial in the first row, from 1. */
  readonly firstTrial: number;
  /** One row per trial in trial order, `columns` values each, row after row. */
  readonly rows: Float64Array;
  /** What was counted over the chunk, such as clamped values. */
  readonly counters: readonly number[];
}

/** Why bytes are not a whole chunk of a run: damaged, or whole and of another run. */
export interface NoChunk {
  readonly fault: 'damaged' | 'foreign';
  /** In words, to stand behind "chunk 3". */
  readonly why: string;
}

const MAGIC = Buffer.from('pw-chunk', 'latin1');
const VERSION = 1;
const HEADER_LENGTH = 56;
const MARK_LENGTH = 16;
const HASH_LENGTH = 32;

/**
 * A chunk as a file, all numbers little-endian: 8 bytes `pw-chunk`, uint32 version, uint32 columns, uint64
 * number, uint64 first trial, uint32 rows, uint32 counters, 16 bytes that mark the run; the counters and then
 * the rows as doubles; SHA-256 over all of that.
 * @throws RangeError when rows do not come out even, or a number does not count from 1
 */
export function encodeChunk(chunk: Chunk, columns: number, runId: string): Uint8Array {
  const { number, firstTrial, rows, counters } = chunk;
  for (const [name, value] of Object.entries({ number, firstTrial, columns })) {
    if (!(Number.isSafeInteger(value) && value >= 1)) throw new RangeError(`${name} of a chunk is ${value}`);
  }
  const rowCount = rows.length / columns;
  if (!Number.isInteger(rowCount)) {
    throw new RangeError(`chunk ${number} has ${rows.length} values, which is no whole number of rows`);
  }
  const body = HEADER_LENGTH + 8 * counters.length + 8 * rows.length;
  const bytes = Buffer.alloc(body + HASH_LENGTH);
  MAGIC.copy(bytes);
  bytes.writeUInt32LE(VERSION, 8);
  bytes.writeUInt32LE(columns, 12);
  bytes.writeBigUInt64LE(BigInt(number), 16);
  bytes.writeBigUInt64LE(BigInt(firstTrial), 24);
  bytes.writeUInt32LE(rowCount, 32);
  bytes.writeUInt32LE(counters.length, 36);
  runMark(runId).copy(bytes, 40);
  bytes.set(littleEndianBytes(Float64Array.from(counters)), HEADER_LENGTH);
  bytes.set(littleEndianBytes(rows), HEADER_LENGTH + 8 * counters.length);
  sha256(bytes.subarray(0, body)).copy(bytes, body);
  return bytes;
}

/**
 * The chunk in a file's bytes, if they are whole, and of this run, number and width. Bit for bit what was
 * encoded.
 */
export function decodeChunk(
  bytes: Uint8Array,
  number: number,
  columns: number,
  runId: string,
): Chunk | NoChunk {
  const body = bytes.length - HASH_LENGTH;
  if (!(body >= HEADER_LENGTH)) return { fault: 'damaged', why: 'ends too early' };
  const file = Buffer.from(bytes.buffer, bytes.byteOffset, bytes.length);
  if (!sha256(file.subarray(0, body)).equals(file.subarray(body))) {
    return { fault: 'damaged', why: 'is not what was written' };
  }
  if (!file.subarray(0, MAGIC.length).equals(MAGIC) || file.readUInt32LE(8) !== VERSION) {
    return { fault: 'foreign', why: 'is of another version' };
  }
  if (
    !file.subarray(40, HEADER_LENGTH).equals(runMark(runId)) ||
    file.readUInt32LE(12) !== columns ||
    file.readBigUInt64LE(16) !== BigInt(number)
  ) {
    return { fault: 'foreign', why: 'is of another run or has another number' };
  }
  const rowCount = file.readUInt32LE(32);
  const counterCount = file.readUInt32LE(36);
  if (body !== HEADER_LENGTH + 8 * (counterCount + rowCount * columns)) {
    return { fault: 'damaged', why: 'has another length than it says' };
  }
  return {
    number,
    firstTrial: Number(file.readBigUInt64LE(24)),
    counters: Array.from(doublesFromBytes(bytes, HEADER_LENGTH, counterCount)),
    rows: doublesFromBytes(bytes, HEADER_LENGTH + 8 * counterCount, rowCount * columns),
  };
}

/** What ties a chunk to its run, so that a file that strayed from another one is never taken. */
function runMark(runId: string): Buffer {
  return sha256(Buffer.from(runId, 'utf8')).subarray(0, MARK_LENGTH);
}

function sha256(bytes: Uint8Array): Buffer {
  return createHash('sha256').update(bytes).digest();
}

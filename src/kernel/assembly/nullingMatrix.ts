// What both nullings share: how the matrix lies in memory, how a rotation is found, and how rows and columns
// pass through rotations.
//
// A row is a sequence of tiles of four doubles, re re' im im' of two neighbouring columns. Two columns are
// then one vector wherever rows are rotated, real and imaginary part have one address, and four columns fill
// a cache line. Rows are taken four at a time where columns are rotated, from the bottom: up to three rows
// above the first one are read and written, but nothing depends on them, as nothing depends on the columns
// between N and the next multiple of four. No nulled entry is ever set to zero: no rotation is found from it.
//
// A rotation [[c, -conj(s)], [s, c]] is four doubles: c, re s, im s, and one that is not used.
//
// What cells can do is two doubles a cell, in the order of the mesh: the least c and the least |s|.

import { add, multiply, subtract } from './lanes';

/** Bytes of a rotation; also of a tile. */
export const ROTATION: usize = 32;
/** From the real part of an entry to the imaginary one. */
const IMAGINARY: usize = 16;
/** Rows above the first one that may be written. */
const ROWS_ABOVE: usize = 3;
/** Bytes of a cell's reach. */
const REACH: usize = 16;
/** Bytes of a column on the average: four columns are 64. */
export const COLUMN: usize = 16;

/** Bytes from the start of a row to the real part of a column. */
@inline export function columnOffset(column: i32): usize {
  return (usize(column >> 1) << 5) + (usize(column & 1) << 3);
}

// The rotation turns the entries (kept, nulled) into (c kept + conj(s) nulled, c nulled - s kept).
@inline function keptRe(c: v128, sr: v128, si: v128, kept: v128, nulledRe: v128, nulledIm: v128): v128 {
  return add(multiply(c, kept), add(multiply(sr, nulledRe), multiply(si, nulledIm)));
}
@inline function keptIm(c: v128, sr: v128, si: v128, kept: v128, nulledRe: v128, nulledIm: v128): v128 {
  return add(multiply(c, kept), subtract(multiply(sr, nulledIm), multiply(si, nulledRe)));
}
@inline function nulledRe(c: v128, sr: v128, si: v128, nulled: v128, keptRe: v128, keptIm: v128): v128 {
  return subtract(multiply(c, nulled), subtract(multiply(sr, keptRe), multiply(si, keptIm)));
}
@inline function nulledIm(c: v128, sr: v128, si: v128, nulled: v128, keptRe: v128, keptIm: v128): v128 {
  return subtract(multiply(c, nulled), add(multiply(sr, keptIm), multiply(si, keptRe)));
}

/**
 * Writes the rotation that nulls the entry at `nulled` against the one at `kept`. Entries whose squares are
 * at most `negligibleSquare` count as zero: nothing to null is the exact bar state, nothing to keep the exact
 * cross state. What the cell cannot do becomes the nearest that it can, the phase of s kept.
 */
@inline export function findRotation(
  rotation: usize, nulled: usize, kept: usize, negligibleSquare: f64, reach: usize, cell: i32,
): void {
  const nr = load<f64>(nulled);
  const ni = load<f64>(nulled, IMAGINARY);
  const kr = load<f64>(kept);
  const ki = load<f64>(kept, IMAGINARY);
  const nulledSquare = nr * nr + ni * ni;
  const keptSquare = kr * kr + ki * ki;
  let c = 1.0;
  let sr = 0.0;
  let si = 0.0;
  if (nulledSquare <= negligibleSquare) {
    // bar
  } else if (keptSquare <= negligibleSquare) {
    c = 0.0;
    sr = 1.0;
  } else {
    const scale = 1.0 / sqrt(keptSquare * (nulledSquare + keptSquare));
    c = keptSquare * scale;
    sr = (nr * kr + ni * ki) * scale;
    si = (ni * kr - nr * ki) * scale;
  }
  const ownReach = reach + usize(cell) * REACH;
  const leastBar = load<f64>(ownReach);
  const leastCross = load<f64>(ownReach, 8);
  const sineSquare = sr * sr + si * si;
  if (c < leastBar) {
    const sine = max(leastCross, sqrt((1.0 - leastBar) * (1.0 + leastBar)));
    const scale = sine / sqrt(sineSquare);
    c = leastBar;
    sr *= scale;
    si *= scale;
  } else if (sineSquare < leastCross * leastCross) {
    const scale = leastCross / sqrt(sineSquare);
    c = max(leastBar, sqrt((1.0 - leastCross) * (1.0 + leastCross)));
    if (sineSquare > 0.0) {
      sr *= scale;
      si *= scale;
    } else {
      sr = leastCross;
      si = 0.0;
    }
  }
  store<f64>(rotation, c);
  store<f64>(rotation, sr, 8);
  store<f64>(rotation, si, 16);
}

/**
 * Copies a rotation to the place of a cell in the results: planes of `cells` doubles for c, re s and im s.
 */
@inline export function putAtCell(results: usize, cells: i32, cell: i32, rotation: usize): void {
  const place = results + (usize(cell) << 3);
  const plane = usize(cells) << 3;
  store<f64>(place, load<f64>(rotation));
  store<f64>(place + plane, load<f64>(rotation, 8));
  store<f64>(place + 2 * plane, load<f64>(rotation, 16));
}

/**
 * Lays a matrix out in tiles, zeros in the places around it. Entry (i, j) stands at `first` + i `rowStep` + j
 * `columnStep` of the plane at `source` (N^2 doubles for re, then as many for im); steps may be negative, so
 * that the matrix can be transposed or turned round on the way.
 */
export function layOutMatrix(
  modes: i32, source: usize, first: i32, rowStep: i32, columnStep: i32, matrix: usize, rowBytes: usize,
): void {
  const plane = usize(modes * modes) << 3;
  memory.fill(matrix - ROWS_ABOVE * rowBytes, 0, (usize(modes) + ROWS_ABOVE) * rowBytes);
  for (let row = 0; row < modes; row++) {
    let entry = source + (usize(first + row * rowStep) << 3);
    for (let column = 0; column < modes; column++) {
      const place = matrix + columnOffset(column);
      store<f64>(place, load<f64>(entry));
      store<f64>(place, load<f64>(entry + plane), IMAGINARY);
      entry += usize(columnStep) << 3;
    }
    matrix += rowBytes;
  }
}

/** Writes re and im of the diagonal entries one after another. */
export function readDiagonal(modes: i32, matrix: usize, rowBytes: usize, diagonal: usize): void {
  for (let i = 0; i < modes; i++) {
    const entry = matrix + usize(i) * rowBytes + columnOffset(i);
    store<f64>(diagonal, load<f64>(entry));
    store<f64>(diagonal, load<f64>(entry, IMAGINARY), 8);
    diagonal += 16;
  }
}

/**
 * Passes a strip of four columns through `count` rotations of neighbouring rows, downwards from the row at
 * `upper` (the kept one of the first rotation); the row that two rotations have in common stays in registers.
 */
@inline export function rotateRowsDown(upper: usize, rowBytes: usize, rotation: usize, count: i32): void {
  let re0 = v128.load(upper);
  let im0 = v128.load(upper, 16);
  let re1 = v128.load(upper, 32);
  let im1 = v128.load(upper, 48);
  for (; count > 0; count--) {
    const c = v128.load64_splat(rotation);
    const sr = v128.load64_splat(rotation, 8);
    const si = v128.load64_splat(rotation, 16);
    rotation += ROTATION;
    const lower = upper + rowBytes;
    const lowerRe0 = v128.load(lower);
    const lowerIm0 = v128.load(lower, 16);
    v128.store(upper, keptRe(c, sr, si, re0, lowerRe0, lowerIm0));
    v128.store(upper, keptIm(c, sr, si, im0, lowerRe0, lowerIm0), 16);
    const nextRe0 = nulledRe(c, sr, si, lowerRe0, re0, im0);
    im0 = nulledIm(c, sr, si, lowerIm0, re0, im0);
    re0 = nextRe0;
    const lowerRe1 = v128.load(lower, 32);
    const lowerIm1 = v128.load(lower, 48);
    v128.store(upper, keptRe(c, sr, si, re1, lowerRe1, lowerIm1), 32);
    v128.store(upper, keptIm(c, sr, si, im1, lowerRe1, lowerIm1), 48);
    const nextRe1 = nulledRe(c, sr, si, lowerRe1, re1, im1);
    im1 = nulledIm(c, sr, si, lowerIm1, re1, im1);
    re1 = nextRe1;
    upper = lower;
  }
  v128.store(upper, re0);
  v128.store(upper, im0, 16);
  v128.store(upper, re1, 32);
  v128.store(upper, im1, 48);
}

/** The doubles at two addresses. */
@inline function loadPair(first: usize, second: usize): v128 {
  return v128.load_lane<f64>(second, v128.load64_zero(first), 1);
}
@inline function storePair(first: usize, second: usize, pair: v128): void {
  v128.store_lane<f64>(first, pair, 0);
  v128.store_lane<f64>(second, pair, 1);
}

/**
 * Passes four rows, the lowest at `row`, through `count` rotations of neighbouring columns, leftwards from
 * column `kept` (the kept one of the first rotation). The lanes of a vector are two rows.
 */
@inline export function rotateColumnsLeft(
  row: usize, rowBytes: usize, kept: i32, rotation: usize, count: i32,
): void {
  let at0 = row + columnOffset(kept);
  let at1 = at0 - rowBytes;
  let at2 = at1 - rowBytes;
  let at3 = at2 - rowBytes;
  let reA = loadPair(at0, at1);
  let imA = loadPair(at0 + IMAGINARY, at1 + IMAGINARY);
  let reB = loadPair(at2, at3);
  let imB = loadPair(at2 + IMAGINARY, at3 + IMAGINARY);
  for (; count > 0; count--) {
    const c = v128.load64_splat(rotation);
    const sr = v128.load64_splat(rotation, 8);
    const si = v128.load64_splat(rotation, 16);
    rotation += ROTATION;
    // From an odd column to the even one in its tile, or to the odd one of the tile before.
    const step: usize = kept & 1 ? 8 : 24;
    kept--;
    const leftReA = loadPair(at0 - step, at1 - step);
    const leftImA = loadPair(at0 - step + IMAGINARY, at1 - step + IMAGINARY);
    storePair(at0, at1, keptRe(c, sr, si, reA, leftReA, leftImA));
    storePair(at0 + IMAGINARY, at1 + IMAGINARY, keptIm(c, sr, si, imA, leftReA, leftImA));
    const nextReA = nulledRe(c, sr, si, leftReA, reA, imA);
    imA = nulledIm(c, sr, si, leftImA, reA, imA);
    reA = nextReA;
    const leftReB = loadPair(at2 - step, at3 - step);
    const leftImB = loadPair(at2 - step + IMAGINARY, at3 - step + IMAGINARY);
    storePair(at2, at3, keptRe(c, sr, si, reB, leftReB, leftImB));
    storePair(at2 + IMAGINARY, at3 + IMAGINARY, keptIm(c, sr, si, imB, leftReB, leftImB));
    const nextReB = nulledRe(c, sr, si, leftReB, reB, imB);
    imB = nulledIm(c, sr, si, leftImB, reB, imB);
    reB = nextReB;
    at0 -= step;
    at1 -= step;
    at2 -= step;
    at3 -= step;
  }
  storePair(at0, at1, reA);
  storePair(at0 + IMAGINARY, at1 + IMAGINARY, imA);
  storePair(at2, at3, reB);
  storePair(at2 + IMAGINARY, at3 + IMAGINARY, imB);
}

/**
 * Passes four rows, the lowest at `row`, through `count` rotations of neighbouring columns, rightwards from
 * column `nulled` (the nulled one of the first rotation). The lanes of a vector are two rows.
 */
@inline export function rotateColumnsRight(
  row: usize, rowBytes: usize, nulled: i32, rotation: usize, count: i32,
): void {
  let at0 = row + columnOffset(nulled);
  let at1 = at0 - rowBytes;
  let at2 = at1 - rowBytes;
  let at3 = at2 - rowBytes;
  let reA = loadPair(at0, at1);
  let imA = loadPair(at0 + IMAGINARY, at1 + IMAGINARY);
  let reB = loadPair(at2, at3);
  let imB = loadPair(at2 + IMAGINARY, at3 + IMAGINARY);
  for (; count > 0; count--) {
    const c = v128.load64_splat(rotation);
    const sr = v128.load64_splat(rotation, 8);
    const si = v128.load64_splat(rotation, 16);
    rotation += ROTATION;
    // From an odd column to the even one of the next tile, or to the odd one in its tile.
    const step: usize = nulled & 1 ? 24 : 8;
    nulled++;
    const rightReA = loadPair(at0 + step, at1 + step);
    const rightImA = loadPair(at0 + step + IMAGINARY, at1 + step + IMAGINARY);
    storePair(at0, at1, nulledRe(c, sr, si, reA, rightReA, rightImA));
    storePair(at0 + IMAGINARY, at1 + IMAGINARY, nulledIm(c, sr, si, imA, rightReA, rightImA));
    const nextReA = keptRe(c, sr, si, rightReA, reA, imA);
    imA = keptIm(c, sr, si, rightImA, reA, imA);
    reA = nextReA;
    const rightReB = loadPair(at2 + step, at3 + step);
    const rightImB = loadPair(at2 + step + IMAGINARY, at3 + step + IMAGINARY);
    storePair(at2, at3, nulledRe(c, sr, si, reB, rightReB, rightImB));
    storePair(at2 + IMAGINARY, at3 + IMAGINARY, nulledIm(c, sr, si, imB, rightReB, rightImB));
    const nextReB = keptRe(c, sr, si, rightReB, reB, imB);
    imB = keptIm(c, sr, si, rightImB, reB, imB);
    reB = nextReB;
    at0 += step;
    at1 += step;
    at2 += step;
    at3 += step;
  }
  storePair(at0, at1, reA);
  storePair(at0 + IMAGINARY, at1 + IMAGINARY, imA);
  storePair(at2, at3, reB);
  storePair(at2 + IMAGINARY, at3 + IMAGINARY, imB);
}

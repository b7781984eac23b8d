// Fields through a mesh and adjoint fields back: the gradient of a cost of the transfer matrix by all phases.
// Eight input ports at a time (a panel), so that a panel stays in the first-level cache. The kernels know the
// cells by their 2x2 matrices alone; what a phase does to them is reckoned elsewhere, once a cell.

import { add, overlapIm, overlapRe, productIm, productRe } from './lanes';

/** Bytes of a row of a panel: eight real parts, eight imaginary parts. */
const ROW = 128;
/** Bytes of a cell's transfer matrix and of its correlations: 11 re, im, 12, 21, 22. */
const CELL = 64;

/** Two complex entries of both rows, behind the cell; with `keeps`, before it they are written to `history`. */
@inline function carryEntries(
  x: usize, history: usize, keeps: i32, ar: v128, ai: v128, br: v128, bi: v128, cr: v128, ci: v128, dr: v128, di: v128,
): void {
  const a = v128.load(x);
  const b = v128.load(x, 64);
  const c = v128.load(x, ROW);
  const d = v128.load(x, ROW + 64);
  if (keeps) {
    v128.store(history, a);
    v128.store(history, b, 64);
    v128.store(history, c, ROW);
    v128.store(history, d, ROW + 64);
  }
  v128.store(x, add(productRe(ar, ai, a, b), productRe(br, bi, c, d)));
  v128.store(x, add(productIm(ar, ai, a, b), productIm(br, bi, c, d)), 64);
  v128.store(x, add(productRe(cr, ci, a, b), productRe(dr, di, c, d)), ROW);
  v128.store(x, add(productIm(cr, ci, a, b), productIm(dr, di, c, d)), ROW + 64);
}

/**
 * Sends the fields of a panel through the cells, in the order of their numbers. ranges: for each column the
 * first cell that the panel's light can have reached and the one behind the last, 32 bits each. transfers: 64
 * bytes a cell. With keeps = 1 the two rows before each cell are appended at history, 256 bytes a cell met.
 */
export function carryFields(
  columns: i32, ranges: usize, upperPort: usize, transfers: usize, panel: usize, history: usize, keeps: i32,
): void {
  for (let column = 0; column < columns; column++) {
    const last = load<i32>(ranges, 4);
    for (let cell = load<i32>(ranges); cell < last; cell++) {
      const x = panel + usize(load<i32>(upperPort + usize(cell) * 4)) * ROW;
      const t = transfers + usize(cell) * CELL;
      const ar = v128.load64_splat(t);
      const ai = v128.load64_splat(t, 8);
      const br = v128.load64_splat(t, 16);
      const bi = v128.load64_splat(t, 24);
      const cr = v128.load64_splat(t, 32);
      const ci = v128.load64_splat(t, 40);
      const dr = v128.load64_splat(t, 48);
      const di = v128.load64_splat(t, 56);
      carryEntries(x, history, keeps, ar, ai, br, bi, cr, ci, dr, di);
      carryEntries(x + 16, history + 16, keeps, ar, ai, br, bi, cr, ci, dr, di);
      carryEntries(x + 32, history + 32, keeps, ar, ai, br, bi, cr, ci, dr, di);
      carryEntries(x + 48, history + 48, keeps, ar, ai, br, bi, cr, ci, dr, di);
      history += 2 * ROW;
    }
    ranges += 8;
  }
}

/** Adds the sums of both lanes, re and im, to two doubles. */
@inline function accumulate(at: usize, re: v128, im: v128): void {
  const sums = add(v128.shuffle<f64>(re, im, 0, 2), v128.shuffle<f64>(re, im, 1, 3));
  v128.store(at, add(v128.load(at), sums));
}

/** Two complex entries of both rows of adjoint fields, before the cell: its adjoint matrix times them. */
@inline function carryBack(
  x: usize, ar: v128, ai: v128, br: v128, bi: v128, cr: v128, ci: v128, dr: v128, di: v128,
): void {
  const a = v128.load(x);
  const b = v128.load(x, 64);
  const c = v128.load(x, ROW);
  const d = v128.load(x, ROW + 64);
  v128.store(x, add(overlapRe(a, b, ar, ai), overlapRe(c, d, cr, ci)));
  v128.store(x, add(overlapIm(a, b, ar, ai), overlapIm(c, d, cr, ci)), 64);
  v128.store(x, add(overlapRe(a, b, br, bi), overlapRe(c, d, dr, di)), ROW);
  v128.store(x, add(overlapIm(a, b, br, bi), overlapIm(c, d, dr, di)), ROW + 64);
}

/**
 * Carries a panel of adjoint fields back from behind the last column to before the first, over the same cells
 * in reverse. historyEnd: behind what carryFields has appended for this panel. To the correlations of each
 * cell (64 bytes a cell) is added, at number 2 b + a, the sum over the panel of conj(adjoint on guide b behind
 * the cell) times the field on guide a before it.
 */
export function carryAdjoints(
  columns: i32, ranges: usize, upperPort: usize, transfers: usize, panel: usize, historyEnd: usize, correlations: usize,
): void {
  ranges += usize(columns) * 8;
  for (let column = 0; column < columns; column++) {
    ranges -= 8;
    const first = load<i32>(ranges);
    for (let cell = load<i32>(ranges, 4) - 1; cell >= first; cell--) {
      historyEnd -= 2 * ROW;
      const x = panel + usize(load<i32>(upperPort + usize(cell) * 4)) * ROW;
      correlateRow(x, historyEnd, correlations + usize(cell) * CELL);
      correlateRow(x + ROW, historyEnd, correlations + usize(cell) * CELL + 32);
      const t = transfers + usize(cell) * CELL;
      const ar = v128.load64_splat(t);
      const ai = v128.load64_splat(t, 8);
      const br = v128.load64_splat(t, 16);
      const bi = v128.load64_splat(t, 24);
      const cr = v128.load64_splat(t, 32);
      const ci = v128.load64_splat(t, 40);
      const dr = v128.load64_splat(t, 48);
      const di = v128.load64_splat(t, 56);
      carryBack(x, ar, ai, br, bi, cr, ci, dr, di);
      carryBack(x + 16, ar, ai, br, bi, cr, ci, dr, di);
      carryBack(x + 32, ar, ai, br, bi, cr, ci, dr, di);
      carryBack(x + 48, ar, ai, br, bi, cr, ci, dr, di);
    }
  }
}

/** Correlations of one row of adjoint fields, (re, im), with both rows of fields; four sums fit the registers. */
@inline function correlateRow(adjoints: usize, fields: usize, sums: usize): void {
  let r1 = f64x2.splat(0), i1 = f64x2.splat(0), r2 = f64x2.splat(0), i2 = f64x2.splat(0);
  for (let place: usize = 0; place < 64; place += 16) {
    const u = v128.load(adjoints + place);
    const v = v128.load(adjoints + place, 64);
    const x1 = v128.load(fields + place);
    const y1 = v128.load(fields + place, 64);
    r1 = add(r1, overlapRe(x1, y1, u, v));
    i1 = add(i1, overlapIm(x1, y1, u, v));
    const x2 = v128.load(fields + place, ROW);
    const y2 = v128.load(fields + place, ROW + 64);
    r2 = add(r2, overlapRe(x2, y2, u, v));
    i2 = add(i2, overlapIm(x2, y2, u, v));
  }
  accumulate(sums, r1, i1);
  accumulate(sums + 16, r2, i2);
}

// From splitters and phases to what propagation needs of the cells, two trials side by side.

import {
  add, both, divide, multiply, overlapIm, overlapRe, productIm, productRe, root, square, subtract,
} from './lanes';

const UPPER_INPUT = 0;
const LOWER_INPUT = 1;
const UPPER_OUTPUT = 2;
/** The external phase is in the ways through the cell already. */
const NOWHERE = -1;

/** Bytes of a cell's coefficients: u re, im, v re, im, exchange; 16 bytes each, a lane a trial. */
export const CELL = 80;

/**
 * Cells of a block. The ways through a cell depend on no other cell, unlike the factors of the guides: they are
 * found for a block of cells first, or each cell would wait for the one before with all its roots.
 */
const BLOCK = 16;
/** Bytes of the ways through a cell: re and im of T11, T12, T21, T22, a lane a trial. */
const WAYS = 128;

/**
 * Makes the coefficients of all cells. Every guide's field is held as a factor times what the panels hold, so
 * that a cell costs the panels two complex multiplications and additions in place of four:
 *
 *     x' = x + u y, y' = y + v x     or, where more light crosses than stays, x' = y + u x, y' = x + v y
 *
 * with the factors f1' = T11 f1, f2' = T22 f2 (or T12 f2, T21 f1). No factor is ever less than 1/sqrt(2) of
 * the one before without loss, so nothing underflows up to 1024 cells in a row.
 *
 * In a cell of three splitters the external phase stands between two of them: it and the third one are taken
 * into the ways through the cell.
 *
 * ratios: 16 bytes a splitter, the coupling ratios, a cell's `splitters` (2 or 3) as the light meets
 * them. arms: 4 x 16 bytes a cell. external: 2 x 16 bytes a cell.
 * gain: 16 bytes a cell, the amplitude factor of its splitters' losses. input: 2 x 16 bytes a port, the fields'
 * factors at the inputs; factors: written, those at the outputs. ways: room for BLOCK cells. place: 0 upper
 * input, 1 lower input, 2 upper output, 3 lower output.
 */
export function composeCells(
  cells: i32, upperPort: usize, ratios: usize, arms: usize, external: usize, gain: usize, modes: i32, input: usize,
  factors: usize, ways: usize, coefficients: usize, place: i32, realSplitters: i32, splitters: i32,
): void {
  memory.copy(factors, input, usize(modes) * 32);
  const ofCell = usize(splitters) * 16;
  const hasOuter = splitters == 3;
  const atOutput = place >= UPPER_OUTPUT;
  const first: usize = hasOuter && !atOutput ? 16 : 0;
  const outer: usize = atOutput ? 32 : 0;
  const placeOnGuide = hasOuter ? NOWHERE : place;
  for (let start = 0; start < cells; start += BLOCK) {
    const end = min(start + BLOCK, cells);
    for (let cell = start; cell < end; cell++) {
      findWays(
        ways + usize(cell - start) * WAYS, ratios + usize(cell) * ofCell + first, arms + usize(cell) * 64,
        gain + usize(cell) * 16, realSplitters,
      );
    }
    if (hasOuter) {
      for (let cell = start; cell < end; cell++) {
        const at = ways + usize(cell - start) * WAYS;
        passExternal(at, external + usize(cell) * 32, place);
        passOuterSplitter(at, ratios + usize(cell) * ofCell + outer, atOutput, realSplitters);
      }
    }
    for (let cell = start; cell < end; cell++) {
      composeCell(
        ways + usize(cell - start) * WAYS, factors + usize(load<i32>(upperPort + usize(cell) * 4)) * 32,
        external + usize(cell) * 32, coefficients + usize(cell) * CELL, placeOnGuide,
      );
    }
  }
}

/**
 * Writes the ways through a cell at `ways`. cc = cos b cos a, ss = sin b sin a, cs = cos b sin a, sc = sin b
 * cos a, b being the second splitter; ur, ui and lr, li: factors of the upper and the lower arm.
 */
@inline function storeWays(
  ways: usize, cc: v128, ss: v128, cs: v128, sc: v128, ur: v128, ui: v128, lr: v128, li: v128, realSplitters: i32,
): void {
  if (realSplitters) {
    v128.store(ways, add(multiply(cc, ur), multiply(ss, lr)));
    v128.store(ways, add(multiply(cc, ui), multiply(ss, li)), 16);
    v128.store(ways, subtract(multiply(cs, ur), multiply(sc, lr)), 32);
    v128.store(ways, subtract(multiply(cs, ui), multiply(sc, li)), 48);
    v128.store(ways, subtract(multiply(sc, ur), multiply(cs, lr)), 64);
    v128.store(ways, subtract(multiply(sc, ui), multiply(cs, li)), 80);
    v128.store(ways, add(multiply(ss, ur), multiply(cc, lr)), 96);
    v128.store(ways, add(multiply(ss, ui), multiply(cc, li)), 112);
  } else {
    v128.store(ways, subtract(multiply(cc, ur), multiply(ss, lr)));
    v128.store(ways, subtract(multiply(cc, ui), multiply(ss, li)), 16);
    v128.store(ways, f64x2.neg(add(multiply(cs, ui), multiply(sc, li))), 32);
    v128.store(ways, add(multiply(cs, ur), multiply(sc, lr)), 48);
    v128.store(ways, f64x2.neg(add(multiply(sc, ui), multiply(cs, li))), 64);
    v128.store(ways, add(multiply(sc, ur), multiply(cs, lr)), 80);
    v128.store(ways, subtract(multiply(cc, lr), multiply(ss, ur)), 96);
    v128.store(ways, subtract(multiply(cc, li), multiply(ss, ui)), 112);
  }
}

/** Finds the ways through a cell, its splitters' losses included. */
@inline function findWays(ways: usize, ratios: usize, arms: usize, gain: usize, realSplitters: i32): void {
  const first = v128.load(ratios);
  const second = v128.load(ratios, 16);
  const amplitude = v128.load(gain);
  const cosFirst = root(subtract(both(1.0), first));
  const sinFirst = root(first);
  const cosSecond = multiply(amplitude, root(subtract(both(1.0), second)));
  const sinSecond = multiply(amplitude, root(second));
  storeWays(
    ways, multiply(cosSecond, cosFirst), multiply(sinSecond, sinFirst), multiply(cosSecond, sinFirst),
    multiply(sinSecond, cosFirst), v128.load(arms), v128.load(arms, 16), v128.load(arms, 32), v128.load(arms, 48),
    realSplitters,
  );
}

/** Multiplies the complex number at `at` (2 x 16 bytes) by e. */
@inline function turn(at: usize, er: v128, ei: v128): void {
  const x = v128.load(at);
  const y = v128.load(at, 16);
  v128.store(at, productRe(x, y, er, ei));
  v128.store(at, productIm(x, y, er, ei), 16);
}

/** Multiplies the external phase into the two ways through the cell that pass it. */
function passExternal(ways: usize, external: usize, place: i32): void {
  const er = v128.load(external);
  const ei = v128.load(external, 16);
  const first: usize = place == UPPER_INPUT || place == UPPER_OUTPUT ? 0 : place == LOWER_INPUT ? 32 : 64;
  turn(ways + first, er, ei);
  turn(ways + first + (place < UPPER_OUTPUT ? 64 : 32), er, ei);
}

/** Multiplies the third splitter into the ways through the cell: on the right, or on the left at the output. */
function passOuterSplitter(ways: usize, ratio: usize, atOutput: bool, realSplitters: i32): void {
  const c = root(subtract(both(1.0), v128.load(ratio)));
  const s = root(v128.load(ratio));
  // The splitter is symmetric: it mixes the entries of a row or of a column in the same manner.
  const across: usize = atOutput ? 64 : 32;
  const along: usize = atOutput ? 32 : 64;
  for (let k = 0; k < 2; k++) {
    const one = ways + usize(k) * along;
    const other = one + across;
    const xr = v128.load(one);
    const xi = v128.load(one, 16);
    const yr = v128.load(other);
    const yi = v128.load(other, 16);
    if (realSplitters) {
      v128.store(one, add(multiply(c, xr), multiply(s, yr)));
      v128.store(one, add(multiply(c, xi), multiply(s, yi)), 16);
      v128.store(other, subtract(multiply(s, xr), multiply(c, yr)));
      v128.store(other, subtract(multiply(s, xi), multiply(c, yi)), 16);
    } else {
      v128.store(one, subtract(multiply(c, xr), multiply(s, yi)));
      v128.store(one, add(multiply(c, xi), multiply(s, yr)), 16);
      v128.store(other, subtract(multiply(c, yr), multiply(s, xi)));
      v128.store(other, add(multiply(c, yi), multiply(s, xr)), 16);
    }
  }
}

/**
 * Writes the new factor g of a guide at `port` and the share h/g at `coefficients`: g is what stays on the
 * guide, h what crosses to it, or the other way round where `exchange` is set. staying, crossing: the ways
 * through the cell, to be multiplied by the factors s and c of the guides that they come from.
 */
@inline function composeGuide(
  staying: usize, sr: v128, si: v128, crossing: usize, cr: v128, ci: v128, exchange: v128, port: usize,
  coefficients: usize,
): void {
  let x = v128.load(staying);
  let y = v128.load(staying + 16);
  const stayRe = productRe(x, y, sr, si);
  const stayIm = productIm(x, y, sr, si);
  x = v128.load(crossing);
  y = v128.load(crossing + 16);
  const crossRe = productRe(x, y, cr, ci);
  const crossIm = productIm(x, y, cr, ci);
  const changeRe = v128.and(v128.xor(stayRe, crossRe), exchange);
  const changeIm = v128.and(v128.xor(stayIm, crossIm), exchange);
  const gr = v128.xor(stayRe, changeRe);
  const gi = v128.xor(stayIm, changeIm);
  const hr = v128.xor(crossRe, changeRe);
  const hi = v128.xor(crossIm, changeIm);
  const inverse = divide(both(1.0), square(gr, gi));
  v128.store(port, gr);
  v128.store(port + 16, gi);
  v128.store(coefficients, multiply(overlapRe(hr, hi, gr, gi), inverse));
  v128.store(coefficients + 16, multiply(overlapIm(hr, hi, gr, gi), inverse));
}

/** Takes a cell's factors into those of its two guides, at `ports`, and writes what is left of it. */
@inline function composeCell(ways: usize, ports: usize, external: usize, coefficients: usize, place: i32): void {
  const er = v128.load(external);
  const ei = v128.load(external, 16);
  if (place == UPPER_INPUT) turn(ports, er, ei);
  else if (place == LOWER_INPUT) turn(ports + 32, er, ei);
  const stays = square(v128.load(ways), v128.load(ways, 16));
  const crosses = square(v128.load(ways, 32), v128.load(ways, 48));
  const exchange = f64x2.gt(crosses, stays);
  v128.store(coefficients, exchange, 64);
  const f1r = v128.load(ports);
  const f1i = v128.load(ports, 16);
  const f2r = v128.load(ports, 32);
  const f2i = v128.load(ports, 48);
  composeGuide(ways, f1r, f1i, ways + 32, f2r, f2i, exchange, ports, coefficients);
  composeGuide(ways + 96, f2r, f2i, ways + 64, f1r, f1i, exchange, ports + 32, coefficients + 32);
  if (place == UPPER_OUTPUT) turn(ports, er, ei);
  else if (place > UPPER_OUTPUT) turn(ports + 32, er, ei);
}

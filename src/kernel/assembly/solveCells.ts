// The cell solver for two trials side by side: the sweep of src/program/carryingSweep.ts with the solver of
// src/chip/solveCell.ts, where no shifter range binds. It finds e^{i theta} and e^{i phi} by roots alone; no
// angle is ever computed.

import { add, both, divide, multiply, overlapIm, overlapRe, productIm, productRe, root, square, subtract } from './lanes';

const ARM_LOWER = 1;
const ARM_DIFFERENTIAL = 2;

@inline function positivePart(a: v128): v128 { return f64x2.pmax(a, both(0.0)); }
@inline function isZero(a: v128): v128 { return f64x2.eq(a, both(0.0)); }
@inline function negative(a: v128): v128 { return f64x2.neg(a); }

/** Writes z/|z| at `out` (2 x 16 bytes), 1 where z is 0. */
@inline function storeDirection(out: usize, re: v128, im: v128): void {
  const length = root(square(re, im));
  const zero = isZero(length);
  const inverse = divide(both(1.0), v128.bitselect(both(1.0), length, zero));
  v128.store(out, v128.bitselect(both(1.0), multiply(re, inverse), zero));
  v128.store(out, v128.bitselect(both(0.0), multiply(im, inverse), zero), 16);
}

/** carried[port] *= diagonal[port] */
@inline function takeUpDiagonal(port: i32, diagonal: usize, carried: usize): void {
  const at = carried + usize(port) * 32;
  const d = diagonal + usize(port) * 32;
  const x = v128.load(at);
  const y = v128.load(at, 16);
  v128.store(at, productRe(x, y, v128.load(d), v128.load(d, 16)));
  v128.store(at, productIm(x, y, v128.load(d), v128.load(d, 16)), 16);
}

/**
 * Finds the phases of all cells of two chips, sweeping with the light (againstLight = 0: external phase at
 * the input) or against it.
 *
 * upperPort: 32-bit index of each cell's upper port. splitters: 4 x 16 bytes a cell, cos a, sin a of the
 * first splitter, then of the second. wanted: 4 x 16 bytes a cell: c, Re s, Im s, |s| of the factor [[c,
 * -conj(s)], [s, c]]. diagonal: 2 x 16 bytes a port, the decomposition's diagonal. diagonalAt: 32-bit index,
 * for each port, of the cell at which the sweep takes it up, -1 for the end. carried: 2 x 16 bytes a port;
 * holds the factors of the port phases at the end. arms: 4 x 16 bytes a cell, written: amplitude factors of
 * the upper and the lower arm. external: 2 x 16 bytes a cell, written: factor of the external phase.
 * internalArm: 0 upper, 1 lower, 2 differential. onLower: external phase on the lower guide. realSplitters:
 * the form [[cos, sin], [sin, -cos]]. shifterLoss: amplitude factor, multiplied into what is written but not
 * reckoned with.
 */
export function solveCells(
  cells: i32, modes: i32, upperPort: usize, splitters: usize, wanted: usize, diagonal: usize, diagonalAt: usize,
  carried: usize, arms: usize, external: usize,
  internalArm: i32, onLower: i32, againstLight: i32, realSplitters: i32, shifterLoss: f64,
): void {
  for (let port = 0; port < modes; port++) {
    v128.store(carried + usize(port) * 32, both(1.0));
    v128.store(carried + usize(port) * 32, both(0.0), 16);
  }
  for (let step = 0; step < cells; step++) {
    const cell = againstLight ? cells - 1 - step : step;
    const upper = load<i32>(upperPort + usize(cell) * 4);
    for (let port = upper; port <= upper + 1; port++) {
      if (load<i32>(diagonalAt + usize(port) * 4) == cell) takeUpDiagonal(port, diagonal, carried);
    }
    solveCell(
      splitters + usize(cell) * 64, wanted + usize(cell) * 64, carried + usize(upper) * 32,
      arms + usize(cell) * 64, external + usize(cell) * 32,
      internalArm, onLower, againstLight, realSplitters, both(shifterLoss),
    );
  }
  for (let port = 0; port < modes; port++) {
    if (load<i32>(diagonalAt + usize(port) * 4) < 0) takeUpDiagonal(port, diagonal, carried);
  }
}

@inline function solveCell(
  splitters: usize, wanted: usize, ports: usize, arms: usize, external: usize,
  internalArm: i32, onLower: i32, againstLight: i32, realSplitters: i32, shifterLoss: v128,
): void {
  const cosFirst = v128.load(splitters);
  const sinFirst = v128.load(splitters, 16);
  const cosSecond = v128.load(splitters, 32);
  const sinSecond = v128.load(splitters, 48);
  const cc = multiply(cosSecond, cosFirst);
  const ss = multiply(sinSecond, sinFirst);
  const cs = multiply(cosSecond, sinFirst);
  const sc = multiply(sinSecond, cosFirst);
  const c = v128.load(wanted);
  const sr = v128.load(wanted, 16);
  const si = v128.load(wanted, 32);

  // sin^2(theta/2) : cos^2(theta/2) = |W11|^2 - cos^2(a+b) : |W12|^2 - sin^2(a-b), exchanged for real
  // splitters.
  const leastBar = f64x2.abs(subtract(cc, ss));
  const leastCross = f64x2.abs(subtract(cs, sc));
  const crossAmplitude = v128.load(wanted, 48);
  const bar = positivePart(multiply(subtract(c, leastBar), add(c, leastBar)));
  const cross = positivePart(multiply(subtract(crossAmplitude, leastCross), add(crossAmplitude, leastCross)));
  const fixed = v128.or(isZero(multiply(cc, ss)), isZero(add(bar, cross)));
  const inverse = divide(both(1.0), v128.bitselect(both(1.0), add(bar, cross), fixed));
  const forSine = realSplitters ? cross : bar;
  const forCosine = realSplitters ? bar : cross;
  const halfSine = v128.bitselect(both(0.0), root(multiply(forSine, inverse)), fixed);
  const halfCosine = v128.bitselect(both(1.0), root(multiply(forCosine, inverse)), fixed);

  // The arms: e^{i theta} on one, or e^{+-i theta/2} on both.
  const turnRe = subtract(multiply(halfCosine, halfCosine), multiply(halfSine, halfSine));
  const turnIm = multiply(both(2.0), multiply(halfSine, halfCosine));
  let ur = both(1.0);
  let ui = both(0.0);
  let lr = both(1.0);
  let li = both(0.0);
  if (internalArm == ARM_DIFFERENTIAL) {
    ur = halfCosine;
    ui = halfSine;
    lr = halfCosine;
    li = negative(halfSine);
  } else if (internalArm == ARM_LOWER) {
    lr = turnRe;
    li = turnIm;
  } else {
    ur = turnRe;
    ui = turnIm;
  }
  const lossUpper = internalArm == ARM_LOWER ? both(1.0) : shifterLoss;
  const lossLower = internalArm == ARM_LOWER || internalArm == ARM_DIFFERENTIAL ? shifterLoss : both(1.0);
  v128.store(arms, multiply(ur, lossUpper));
  v128.store(arms, multiply(ui, lossUpper), 16);
  v128.store(arms, multiply(lr, lossLower), 32);
  v128.store(arms, multiply(li, lossLower), 48);

  // S(b) diag(upper, lower) S(a)
  let t11r: v128, t11i: v128, t12r: v128, t12i: v128, t21r: v128, t21i: v128, t22r: v128, t22i: v128;
  if (realSplitters) {
    t11r = add(multiply(cc, ur), multiply(ss, lr));
    t11i = add(multiply(cc, ui), multiply(ss, li));
    t12r = subtract(multiply(cs, ur), multiply(sc, lr));
    t12i = subtract(multiply(cs, ui), multiply(sc, li));
    t21r = subtract(multiply(sc, ur), multiply(cs, lr));
    t21i = subtract(multiply(sc, ui), multiply(cs, li));
    t22r = add(multiply(ss, ur), multiply(cc, lr));
    t22i = add(multiply(ss, ui), multiply(cc, li));
  } else {
    t11r = subtract(multiply(cc, ur), multiply(ss, lr));
    t11i = subtract(multiply(cc, ui), multiply(ss, li));
    t12r = negative(add(multiply(cs, ui), multiply(sc, li)));
    t12i = add(multiply(cs, ur), multiply(sc, lr));
    t21r = negative(add(multiply(sc, ui), multiply(cs, li)));
    t21i = add(multiply(sc, ur), multiply(cs, lr));
    t22r = subtract(multiply(cc, lr), multiply(ss, ur));
    t22i = subtract(multiply(cc, li), multiply(ss, ui));
  }

  // What is wanted: W diag(e^{i d}) with the light, diag(e^{i d}) W against it; W12 = -conj(s), W21 = s.
  const d1r = v128.load(ports);
  const d1i = v128.load(ports, 16);
  const d2r = v128.load(ports, 32);
  const d2i = v128.load(ports, 48);
  const e12r = againstLight ? d1r : d2r;
  const e12i = againstLight ? d1i : d2i;
  const e21r = againstLight ? d2r : d1r;
  const e21i = againstLight ? d2i : d1i;
  const w12r = productRe(negative(sr), si, e12r, e12i);
  const w12i = productIm(negative(sr), si, e12r, e12i);
  const w21r = productRe(sr, si, e21r, e21i);
  const w21i = productIm(sr, si, e21r, e21i);

  // Overlaps wanted_ij conj(T_ij); against the light rows and columns change places.
  const z11r = multiply(c, overlapRe(d1r, d1i, t11r, t11i));
  const z11i = multiply(c, overlapIm(d1r, d1i, t11r, t11i));
  const z22r = multiply(c, overlapRe(d2r, d2i, t22r, t22i));
  const z22i = multiply(c, overlapIm(d2r, d2i, t22r, t22i));
  const y12r = overlapRe(w12r, w12i, t12r, t12i);
  const y12i = overlapIm(w12r, w12i, t12r, t12i);
  const y21r = overlapRe(w21r, w21i, t21r, t21i);
  const y21i = overlapIm(w21r, w21i, t21r, t21i);
  const z12r = againstLight ? y21r : y12r;
  const z12i = againstLight ? y21i : y12i;
  const z21r = againstLight ? y12r : y21r;
  const z21i = againstLight ? y12i : y21i;

  // e^{i phi} brings both rows into line.
  const lineRe = add(overlapRe(z11r, z11i, z12r, z12i), overlapRe(z21r, z21i, z22r, z22i));
  const upwards = add(overlapIm(z11r, z11i, z12r, z12i), overlapIm(z21r, z21i, z22r, z22i));
  const lineIm = onLower ? negative(upwards) : upwards;
  storeDirection(external, lineRe, lineIm);
  const fr = v128.load(external);
  const fi = v128.load(external, 16);
  v128.store(external, multiply(fr, shifterLoss));
  v128.store(external, multiply(fi, shifterLoss), 16);
  if (onLower) {
    storeDirection(ports, add(z11r, overlapRe(z12r, z12i, fr, fi)), add(z11i, overlapIm(z12r, z12i, fr, fi)));
    storeDirection(ports + 32, add(z21r, overlapRe(z22r, z22i, fr, fi)), add(z21i, overlapIm(z22r, z22i, fr, fi)));
  } else {
    storeDirection(ports, add(z12r, overlapRe(z11r, z11i, fr, fi)), add(z12i, overlapIm(z11r, z11i, fr, fi)));
    storeDirection(ports + 32, add(z22r, overlapRe(z21r, z21i, fr, fi)), add(z22i, overlapIm(z21r, z21i, fr, fi)));
  }
}

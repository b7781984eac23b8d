// The cell solver for two trials side by side: the sweep of src/program/carryingSweep.ts with the solver of
// src/chip/solveCell.ts, where no shifter range binds. It finds e^{i theta} and e^{i phi} by roots alone; no
// angle is ever computed.

import { add, both, divide, multiply, overlapIm, overlapRe, productIm, productRe, root, square, subtract } from './lanes';

const ARM_LOWER = 1;
const ARM_DIFFERENTIAL = 2;

/**
 * Cells of a block. Arms and turns of a cell depend on no other cell, unlike the carried phases: they are found
 * for a block of cells first, or each cell would wait for the one before with all its roots.
 */
const BLOCK = 16;
/** Bytes of the turns of a cell. */
const TURNS = 128;

@inline function positivePart(a: v128): v128 { return f64x2.pmax(a, both(0.0)); }
@inline function isZero(a: v128): v128 { return f64x2.eq(a, both(0.0)); }
@inline function negative(a: v128): v128 { return f64x2.neg(a); }

/** Set where the complex number at `at` (2 x 16 bytes) is 0. */
@inline function isZeroComplex(at: usize): v128 {
  return v128.and(isZero(v128.load(at)), isZero(v128.load(at + 16)));
}

/** Replaces the complex number z at `at` by z/|z|, by 1 where z is 0. */
@inline function toDirection(at: usize): void {
  const re = v128.load(at);
  const im = v128.load(at + 16);
  const length = root(square(re, im));
  const zero = isZero(length);
  const inverse = divide(both(1.0), v128.bitselect(both(1.0), length, zero));
  v128.store(at, v128.bitselect(both(1.0), multiply(re, inverse), zero));
  v128.store(at + 16, v128.bitselect(both(0.0), multiply(im, inverse), zero));
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
 * upperPort: 32-bit index of each cell's upper port. ratios: 2 x 16 bytes a cell, the coupling ratios. wanted:
 * 4 x 16 bytes a cell: c, the direction of s (re, im) and |s| of the factor [[c, -conj(s)], [s, c]]. diagonal:
 * 2 x 16 bytes a port, the decomposition's diagonal. diagonalAt: 32-bit index, for each port, of the cell at
 * which the sweep takes it up, -1 for the end. carried: 2 x 16 bytes a port; holds the factors of the port
 * phases at the end. turns: room for BLOCK cells. arms: 4 x 16 bytes a cell, written: amplitude factors of the
 * upper and the lower arm. external: 2 x 16 bytes a cell, written: factor of the external phase. internalArm: 0
 * upper, 1 lower, 2 differential. onLower: external phase on the lower guide. realSplitters: the form [[cos,
 * sin], [sin, -cos]]. shifterLoss: amplitude factor, multiplied into what is written but not reckoned with.
 */
export function solveCells(
  cells: i32, modes: i32, upperPort: usize, ratios: usize, wanted: usize, diagonal: usize, diagonalAt: usize,
  carried: usize, turns: usize, arms: usize, external: usize,
  internalArm: i32, onLower: i32, againstLight: i32, realSplitters: i32, shifterLoss: f64,
): void {
  for (let port = 0; port < modes; port++) {
    v128.store(carried + usize(port) * 32, both(1.0));
    v128.store(carried + usize(port) * 32, both(0.0), 16);
  }
  for (let start = 0; start < cells; start += BLOCK) {
    const end = min(start + BLOCK, cells);
    for (let step = start; step < end; step++) {
      const cell = againstLight ? cells - 1 - step : step;
      setArms(
        ratios + usize(cell) * 32, wanted + usize(cell) * 64, arms + usize(cell) * 64,
        turns + usize(step - start) * TURNS, internalArm, realSplitters, both(shifterLoss),
      );
    }
    for (let step = start; step < end; step++) {
      const cell = againstLight ? cells - 1 - step : step;
      setTurns(wanted + usize(cell) * 64, turns + usize(step - start) * TURNS, onLower, againstLight);
    }
    for (let step = start; step < end; step++) {
      const cell = againstLight ? cells - 1 - step : step;
      const upper = load<i32>(upperPort + usize(cell) * 4);
      for (let port = upper; port <= upper + 1; port++) {
        if (load<i32>(diagonalAt + usize(port) * 4) == cell) takeUpDiagonal(port, diagonal, carried);
      }
      carryOn(
        turns + usize(step - start) * TURNS, carried + usize(upper) * 32, external + usize(cell) * 32, onLower,
        both(shifterLoss),
      );
    }
  }
  for (let port = 0; port < modes; port++) {
    if (load<i32>(diagonalAt + usize(port) * 4) < 0) takeUpDiagonal(port, diagonal, carried);
  }
}

/**
 * Finds the arms of a cell. Written at `turns`: T11 and T12, without loss and without the external phase, and
 * det T, which is that of the arms, since both splitters' determinants are 1, or both -1.
 */
@inline function setArms(
  ratios: usize, wanted: usize, arms: usize, turns: usize, internalArm: i32, realSplitters: i32, shifterLoss: v128,
): void {
  const first = v128.load(ratios);
  const second = v128.load(ratios, 16);
  const cosFirst = root(subtract(both(1.0), first));
  const sinFirst = root(first);
  const cosSecond = root(subtract(both(1.0), second));
  const sinSecond = root(second);
  const cc = multiply(cosSecond, cosFirst);
  const ss = multiply(sinSecond, sinFirst);
  const cs = multiply(cosSecond, sinFirst);
  const sc = multiply(sinSecond, cosFirst);
  const c = v128.load(wanted);

  // sin^2(theta/2) : cos^2(theta/2) = |W11|^2 - cos^2(a+b) : |W12|^2 - sin^2(a-b), exchanged for real
  // splitters.
  const leastBar = f64x2.abs(subtract(cc, ss));
  const leastCross = f64x2.abs(subtract(cs, sc));
  const crossAmplitude = v128.load(wanted, 48);
  const bar = positivePart(multiply(subtract(c, leastBar), add(c, leastBar)));
  const cross = positivePart(multiply(subtract(crossAmplitude, leastCross), add(crossAmplitude, leastCross)));
  const fixed = v128.or(isZero(multiply(cc, ss)), isZero(add(bar, cross)));
  const inverse = divide(both(1.0), v128.bitselect(both(1.0), add(bar, cross), fixed));
  const sineSquare = v128.andnot(multiply(realSplitters ? cross : bar, inverse), fixed);
  const cosineSquare = v128.bitselect(both(1.0), multiply(realSplitters ? bar : cross, inverse), fixed);

  // The arms: e^{i theta} on one, or e^{+-i theta/2} on both.
  let ur = both(1.0);
  let ui = both(0.0);
  let lr = both(1.0);
  let li = both(0.0);
  let lossUpper = shifterLoss;
  let lossLower = shifterLoss;
  if (internalArm == ARM_DIFFERENTIAL) {
    ur = root(cosineSquare);
    ui = root(sineSquare);
    lr = ur;
    li = negative(ui);
    v128.store(turns, both(1.0), 64);
    v128.store(turns, both(0.0), 80);
  } else {
    const re = subtract(cosineSquare, sineSquare);
    const im = multiply(both(2.0), root(multiply(sineSquare, cosineSquare)));
    v128.store(turns, re, 64);
    v128.store(turns, im, 80);
    if (internalArm == ARM_LOWER) {
      lr = re;
      li = im;
      lossUpper = both(1.0);
    } else {
      ur = re;
      ui = im;
      lossLower = both(1.0);
    }
  }
  v128.store(arms, multiply(ur, lossUpper));
  v128.store(arms, multiply(ui, lossUpper), 16);
  v128.store(arms, multiply(lr, lossLower), 32);
  v128.store(arms, multiply(li, lossLower), 48);

  if (realSplitters) {
    v128.store(turns, add(multiply(cc, ur), multiply(ss, lr)));
    v128.store(turns, add(multiply(cc, ui), multiply(ss, li)), 16);
    v128.store(turns, subtract(multiply(cs, ur), multiply(sc, lr)), 32);
    v128.store(turns, subtract(multiply(cs, ui), multiply(sc, li)), 48);
  } else {
    v128.store(turns, subtract(multiply(cc, ur), multiply(ss, lr)));
    v128.store(turns, subtract(multiply(cc, ui), multiply(ss, li)), 16);
    v128.store(turns, negative(add(multiply(cs, ui), multiply(sc, li))), 32);
    v128.store(turns, add(multiply(cs, ur), multiply(sc, lr)), 48);
  }
}

/**
 * Replaces what setArms left at `turns` by what the sweep multiplies carried phases with. Let p_ij be the
 * direction of W_ij conj(T_ij), where W is what is wanted and T what the arms give. Both are unitary, so that
 * p11 conj(p12) = p21 conj(p22): the external phase q d1 conj(d2) on the upper guide, q = p11 conj(p12), brings
 * both rows into line at once, and p12 d2 and p22 d2 are carried on. On the lower guide the external phase is
 * the conjugate, and p11 d1 and p21 d1 are carried on. Where an entry of W or T is 0, q is free: the external
 * phase is then 0, and each guide takes up the phase of the guide that its light comes from.
 *
 * Written: q and the factors of the two guides (2 x 16 bytes each), and for each of the two a mask, set where
 * it multiplies d1.
 */
@inline function setTurns(wanted: usize, turns: usize, onLower: i32, againstLight: i32): void {
  const c = v128.load(wanted);
  const sr = v128.load(wanted, 16);
  const si = v128.load(wanted, 32);
  const dr = v128.load(turns, 64);
  const di = v128.load(turns, 80);
  const noBar = v128.or(isZero(c), isZeroComplex(turns));
  const free = v128.or(noBar, v128.or(isZero(v128.load(wanted, 48)), isZeroComplex(turns + 32)));
  const upper1 = v128.bitselect(v128.not(noBar), i64x2.splat(onLower ? -1 : 0), free);
  const upper2 = v128.bitselect(noBar, i64x2.splat(onLower ? -1 : 0), free);

  toDirection(turns);
  toDirection(turns + 32);
  const ar = v128.load(turns);
  const ai = v128.load(turns, 16);
  const br = v128.load(turns, 32);
  const bi = v128.load(turns, 48);
  // W12 = -conj(s), W21 = s, T22 = det conj(T11), T21 = -det conj(T12).
  const p11r = ar;
  const p11i = negative(ai);
  const p22r = overlapRe(ar, ai, dr, di);
  const p22i = overlapIm(ar, ai, dr, di);
  const gr = productRe(sr, si, br, bi);
  const gi = productIm(sr, si, br, bi);
  const y12r = negative(gr);
  const y21r = negative(overlapRe(gr, gi, dr, di));
  const y21i = negative(overlapIm(gr, gi, dr, di));
  // Against the light rows and columns change places.
  const p12r = againstLight ? y21r : y12r;
  const p12i = againstLight ? y21i : gi;
  const p21r = againstLight ? y12r : y21r;
  const p21i = againstLight ? gi : y21i;
  v128.store(turns, overlapRe(p11r, p11i, p12r, p12i));
  v128.store(turns, overlapIm(p11r, p11i, p12r, p12i), 16);
  v128.store(turns, v128.bitselect(p11r, p12r, upper1), 32);
  v128.store(turns, v128.bitselect(p11i, p12i, upper1), 48);
  v128.store(turns, v128.bitselect(p21r, p22r, upper2), 64);
  v128.store(turns, v128.bitselect(p21i, p22i, upper2), 80);
  v128.store(turns, upper1, 96);
  v128.store(turns, upper2, 112);
}

/**
 * Writes the external phase of a cell and replaces the carried phases of its two guides, at `ports`. turns: as
 * setTurns left them.
 */
@inline function carryOn(turns: usize, ports: usize, external: usize, onLower: i32, shifterLoss: v128): void {
  const d1r = v128.load(ports);
  const d1i = v128.load(ports, 16);
  const d2r = v128.load(ports, 32);
  const d2i = v128.load(ports, 48);
  const fromUpper1 = v128.load(turns, 96);
  const fromUpper2 = v128.load(turns, 112);
  const qr = v128.load(turns);
  const qi = v128.load(turns, 16);
  const apartRe = overlapRe(d1r, d1i, d2r, d2i);
  const apartIm = overlapIm(d1r, d1i, d2r, d2i);
  const inLineIm = productIm(apartRe, apartIm, qr, qi);
  // The bases are different where the external phase is free.
  const free = v128.xor(fromUpper1, fromUpper2);
  const phaseRe = v128.bitselect(both(1.0), productRe(apartRe, apartIm, qr, qi), free);
  const phaseIm = v128.bitselect(both(0.0), onLower ? negative(inLineIm) : inLineIm, free);
  v128.store(external, multiply(phaseRe, shifterLoss));
  v128.store(external, multiply(phaseIm, shifterLoss), 16);
  const b1r = v128.bitselect(d1r, d2r, fromUpper1);
  const b1i = v128.bitselect(d1i, d2i, fromUpper1);
  const b2r = v128.bitselect(d1r, d2r, fromUpper2);
  const b2i = v128.bitselect(d1i, d2i, fromUpper2);
  v128.store(ports, productRe(b1r, b1i, v128.load(turns, 32), v128.load(turns, 48)));
  v128.store(ports, productIm(b1r, b1i, v128.load(turns, 32), v128.load(turns, 48)), 16);
  v128.store(ports, productRe(b2r, b2i, v128.load(turns, 64), v128.load(turns, 80)), 32);
  v128.store(ports, productIm(b2r, b2i, v128.load(turns, 64), v128.load(turns, 80)), 48);
}

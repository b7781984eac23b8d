// From cells to the light that arrives. Two trials side by side make the cells' coefficients; then each trial
// is propagated by itself, eight input ports at a time (a panel), so that a panel stays in the first-level
// cache through all columns of the mesh.

import { add, both, divide, multiply, overlapIm, overlapRe, productIm, productRe, square, subtract } from './lanes';

const UPPER_INPUT = 0;
const LOWER_INPUT = 1;
const UPPER_OUTPUT = 2;

/** Bytes of a row of a panel: eight real parts, eight imaginary parts. */
const ROW = 128;
/** Bytes of a cell's coefficients: u re, im, v re, im, exchange; 16 bytes each, a lane a trial. */
const CELL = 80;

/**
 * Makes the coefficients of all cells. Every guide's field is held as a factor times what the panels hold, so
 * that a cell costs the panels two complex multiplications and additions in place of four:
 *
 *     x' = x + u y, y' = y + v x     or, where more light crosses than stays, x' = y + u x, y' = x + v y
 *
 * with the factors f1' = T11 f1, f2' = T22 f2 (or T12 f2, T21 f1). No factor is ever less than 1/sqrt(2) of
 * the one before without loss, so nothing underflows up to 1024 cells in a row.
 *
 * splitters: 4 x 16 bytes a cell (cos a, sin a, cos b, sin b). arms: 4 x 16 bytes a cell. external: 2 x 16
 * bytes a cell. gain: 16 bytes a cell, the amplitude factor of its splitters' losses. input: 2 x 16 bytes a
 * port, the fields' factors at the inputs; factors: written, those at the outputs. place: 0 upper input, 1
 * lower input, 2 upper output, 3 lower output.
 */
export function composeCells(
  cells: i32, upperPort: usize, splitters: usize, arms: usize, external: usize, gain: usize, modes: i32, input: usize,
  factors: usize, coefficients: usize, place: i32, realSplitters: i32,
): void {
  memory.copy(factors, input, usize(modes) * 32);
  for (let cell = 0; cell < cells; cell++) {
    const cosFirst = v128.load(splitters);
    const sinFirst = v128.load(splitters, 16);
    const amplitude = v128.load(gain);
    const cosSecond = multiply(amplitude, v128.load(splitters, 32));
    const sinSecond = multiply(amplitude, v128.load(splitters, 48));
    const cc = multiply(cosSecond, cosFirst);
    const ss = multiply(sinSecond, sinFirst);
    const cs = multiply(cosSecond, sinFirst);
    const sc = multiply(sinSecond, cosFirst);
    const ur = v128.load(arms);
    const ui = v128.load(arms, 16);
    const lr = v128.load(arms, 32);
    const li = v128.load(arms, 48);
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
      t12r = f64x2.neg(add(multiply(cs, ui), multiply(sc, li)));
      t12i = add(multiply(cs, ur), multiply(sc, lr));
      t21r = f64x2.neg(add(multiply(sc, ui), multiply(cs, li)));
      t21i = add(multiply(sc, ur), multiply(cs, lr));
      t22r = subtract(multiply(cc, lr), multiply(ss, ur));
      t22i = subtract(multiply(cc, li), multiply(ss, ui));
    }

    const ports = factors + usize(load<i32>(upperPort)) * 32;
    let f1r = v128.load(ports);
    let f1i = v128.load(ports, 16);
    let f2r = v128.load(ports, 32);
    let f2i = v128.load(ports, 48);
    const er = v128.load(external);
    const ei = v128.load(external, 16);
    if (place == UPPER_INPUT) {
      const re = productRe(f1r, f1i, er, ei);
      f1i = productIm(f1r, f1i, er, ei);
      f1r = re;
    } else if (place == LOWER_INPUT) {
      const re = productRe(f2r, f2i, er, ei);
      f2i = productIm(f2r, f2i, er, ei);
      f2r = re;
    }

    // The four ways through the cell, factors included.
    const a11r = productRe(t11r, t11i, f1r, f1i);
    const a11i = productIm(t11r, t11i, f1r, f1i);
    const a12r = productRe(t12r, t12i, f2r, f2i);
    const a12i = productIm(t12r, t12i, f2r, f2i);
    const a21r = productRe(t21r, t21i, f1r, f1i);
    const a21i = productIm(t21r, t21i, f1r, f1i);
    const a22r = productRe(t22r, t22i, f2r, f2i);
    const a22i = productIm(t22r, t22i, f2r, f2i);
    const exchange = f64x2.gt(square(t12r, t12i), square(t11r, t11i));
    const g1r = v128.bitselect(a12r, a11r, exchange);
    const g1i = v128.bitselect(a12i, a11i, exchange);
    const h1r = v128.bitselect(a11r, a12r, exchange);
    const h1i = v128.bitselect(a11i, a12i, exchange);
    const g2r = v128.bitselect(a21r, a22r, exchange);
    const g2i = v128.bitselect(a21i, a22i, exchange);
    const h2r = v128.bitselect(a22r, a21r, exchange);
    const h2i = v128.bitselect(a22i, a21i, exchange);
    const inverse1 = divide(both(1.0), square(g1r, g1i));
    const inverse2 = divide(both(1.0), square(g2r, g2i));
    v128.store(coefficients, multiply(overlapRe(h1r, h1i, g1r, g1i), inverse1));
    v128.store(coefficients, multiply(overlapIm(h1r, h1i, g1r, g1i), inverse1), 16);
    v128.store(coefficients, multiply(overlapRe(h2r, h2i, g2r, g2i), inverse2), 32);
    v128.store(coefficients, multiply(overlapIm(h2r, h2i, g2r, g2i), inverse2), 48);
    v128.store(coefficients, exchange, 64);

    if (place == UPPER_OUTPUT) {
      v128.store(ports, productRe(g1r, g1i, er, ei));
      v128.store(ports, productIm(g1r, g1i, er, ei), 16);
    } else {
      v128.store(ports, g1r);
      v128.store(ports, g1i, 16);
    }
    if (place > UPPER_OUTPUT) {
      v128.store(ports, productRe(g2r, g2i, er, ei), 32);
      v128.store(ports, productIm(g2r, g2i, er, ei), 48);
    } else {
      v128.store(ports, g2r, 32);
      v128.store(ports, g2i, 48);
    }
    upperPort += 4;
    splitters += 64;
    arms += 64;
    external += 32;
    gain += 16;
    coefficients += CELL;
  }
}

/** Two complex entries of each row: x' = x + u y, y' = y + v x, at a place within the rows. */
@inline function mixEntries(
  x: usize, y: usize, top: usize, place: usize, ur: v128, ui: v128, vr: v128, vi: v128,
): void {
  const a = v128.load(x + place);
  const b = v128.load(x + place, 64);
  const c = v128.load(y + place);
  const d = v128.load(y + place, 64);
  v128.store(top + place, add(a, productRe(ur, ui, c, d)));
  v128.store(top + place, add(b, productIm(ur, ui, c, d)), 64);
  v128.store(top + place, add(c, productRe(vr, vi, a, b)), ROW);
  v128.store(top + place, add(d, productIm(vr, vi, a, b)), ROW + 64);
}

/**
 * Sends light through the mesh of one trial (lane) from the eight input ports of a panel; the panel holds the
 * fields without their factors. ranges: for each column the first cell that the light can have reached and
 * the one behind the last, 32 bits each. Places that no light reaches hold 1e-40 instead of 0, since products
 * of small numbers would become denormal, which is slow.
 */
export function propagatePanel(
  modes: i32, columns: i32, firstInput: i32, lane: i32, ranges: usize, upperPort: usize, coefficients: usize, panel: usize,
): void {
  const tiny = both(1e-40);
  const end = panel + usize(modes) * ROW;
  for (let at = panel; at < end; at += 16) v128.store(at, tiny);
  for (let k = 0; k < min(8, modes - firstInput); k++) {
    store<f64>(panel + usize(firstInput + k) * ROW + usize(k) * 8, 1.0);
  }
  const laneBytes = usize(lane) * 8;
  for (let column = 0; column < columns; column++) {
    const last = load<i32>(ranges, 4);
    for (let cell = load<i32>(ranges); cell < last; cell++) {
      const numbers = coefficients + usize(cell) * CELL + laneBytes;
      const exchanged = usize(load<i32>(numbers, 64)) & ROW;
      const top = panel + usize(load<i32>(upperPort + usize(cell) * 4)) * ROW;
      const x = top + exchanged;
      const y = top + (ROW - exchanged);
      const ur = v128.load64_splat(numbers);
      const ui = v128.load64_splat(numbers, 16);
      const vr = v128.load64_splat(numbers, 32);
      const vi = v128.load64_splat(numbers, 48);
      mixEntries(x, y, top, 0, ur, ui, vr, vi);
      mixEntries(x, y, top, 16, ur, ui, vr, vi);
      mixEntries(x, y, top, 32, ur, ui, vr, vi);
      mixEntries(x, y, top, 48, ur, ui, vr, vi);
    }
    ranges += 8;
  }
}

@inline function laneSum(a: v128): f64 { return f64x2.extract_lane(a, 0) + f64x2.extract_lane(a, 1); }

/**
 * Adds a panel's part to the sums of each row: of conj(U) times the field (re, im) and of the field's square;
 * 24 bytes a row. target: a panel of U.
 */
export function accumulatePanel(modes: i32, panel: usize, target: usize, sums: usize): void {
  for (let row = 0; row < modes; row++) {
    let re = both(0.0);
    let im = both(0.0);
    let power = both(0.0);
    for (let place: usize = 0; place < 64; place += 16) {
      const x = v128.load(panel + place);
      const y = v128.load(panel + place, 64);
      const c = v128.load(target + place);
      const d = v128.load(target + place, 64);
      re = add(re, overlapRe(x, y, c, d));
      im = add(im, overlapIm(x, y, c, d));
      power = add(power, square(x, y));
    }
    store<f64>(sums, load<f64>(sums) + laneSum(re));
    store<f64>(sums, load<f64>(sums, 8) + laneSum(im), 8);
    store<f64>(sums, load<f64>(sums, 16) + laneSum(power), 16);
    sums += 24;
    panel += ROW;
    target += ROW;
  }
}

/**
 * Runs all panels of one trial and judges it. factors: what composeCells left at the outputs; output: 2 x 16
 * bytes a port, facets and port phases. result (one lane of 4 x 16 bytes): Re and Im of Tr(U^dag V), Tr(V^dag
 * V), and the sum over the outputs of |(V U^dag)_ii|.
 */
export function judgeTrial(
  modes: i32, columns: i32, lane: i32, ranges: usize, upperPort: usize, coefficients: usize, panel: usize,
  target: usize, sums: usize, factors: usize, output: usize, result: usize,
): void {
  memory.fill(sums, 0, usize(modes) * 24);
  for (let firstInput = 0; firstInput < modes; firstInput += 8) {
    propagatePanel(modes, columns, firstInput, lane, ranges, upperPort, coefficients, panel);
    accumulatePanel(modes, panel, target, sums);
    ranges += usize(columns) * 8;
    target += usize(modes) * ROW;
  }
  const laneBytes = usize(lane) * 8;
  factors += laneBytes;
  output += laneBytes;
  let traceRe = 0.0;
  let traceIm = 0.0;
  let power = 0.0;
  let portSum = 0.0;
  for (let row = 0; row < modes; row++) {
    const a = load<f64>(factors);
    const b = load<f64>(factors, 16);
    const c = load<f64>(output);
    const d = load<f64>(output, 16);
    const re = a * c - b * d;
    const im = a * d + b * c;
    const x = load<f64>(sums);
    const y = load<f64>(sums, 8);
    const factorPower = re * re + im * im;
    traceRe += re * x - im * y;
    traceIm += re * y + im * x;
    power += factorPower * load<f64>(sums, 16);
    portSum += sqrt(factorPower * (x * x + y * y));
    factors += 32;
    output += 32;
    sums += 24;
  }
  store<f64>(result + laneBytes, traceRe);
  store<f64>(result + laneBytes, traceIm, 16);
  store<f64>(result + laneBytes, power, 32);
  store<f64>(result + laneBytes, portSum, 48);
}

// From cells to the light that arrives. Each trial is propagated by itself, eight input ports at a time (a
// panel), so that a panel stays in the first-level cache through all columns of the mesh.

import { CELL } from './composeCells';
import { add, both, overlapIm, overlapRe, productIm, productRe, square } from './lanes';

/** Bytes of a row of a panel: for four pairs of inputs, two real parts and two imaginary parts. */
const ROW: usize = 128;
/** Bytes of the sums of a row: three of two numbers each. */
const SUMS: usize = 48;

/** Two complex entries of each row: x' = x + u y, y' = y + v x, at a place within the rows. */
@inline function mixEntries(
  x: usize, y: usize, top: usize, place: usize, ur: v128, ui: v128, vr: v128, vi: v128,
): void {
  // Each address is a sum of its own: the compiler then makes the place the offset of the load or store.
  const a = v128.load(x + place);
  const b = v128.load(x + (place + 16));
  const c = v128.load(y + place);
  const d = v128.load(y + (place + 16));
  v128.store(top + place, add(a, productRe(ur, ui, c, d)));
  v128.store(top + (place + 16), add(b, productIm(ur, ui, c, d)));
  v128.store(top + (place + ROW), add(c, productRe(vr, vi, a, b)));
  v128.store(top + (place + ROW + 16), add(d, productIm(vr, vi, a, b)));
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
    store<f64>(panel + usize(firstInput + k) * ROW + usize(k >> 1) * 32 + usize(k & 1) * 8, 1.0);
  }
  const laneBytes = usize(lane) * 8;
  const lastRange = ranges + usize(columns) * 8;
  for (; ranges < lastRange; ranges += 8) {
    const first = load<i32>(ranges);
    let port = upperPort + usize(first) * 4;
    const lastPort = upperPort + usize(load<i32>(ranges, 4)) * 4;
    let numbers = coefficients + usize(first) * CELL + laneBytes;
    for (; port < lastPort; port += 4) {
      const exchanged = usize(load<i32>(numbers, 64)) & ROW;
      const top = panel + usize(load<i32>(port)) * ROW;
      const x = top + exchanged;
      const y = top + ROW - exchanged;
      const ur = v128.load64_splat(numbers);
      const ui = v128.load64_splat(numbers, 16);
      const vr = v128.load64_splat(numbers, 32);
      const vi = v128.load64_splat(numbers, 48);
      mixEntries(x, y, top, 0, ur, ui, vr, vi);
      mixEntries(x, y, top, 32, ur, ui, vr, vi);
      mixEntries(x, y, top, 64, ur, ui, vr, vi);
      mixEntries(x, y, top, 96, ur, ui, vr, vi);
      numbers += CELL;
    }
  }
}

/**
 * Adds a panel's part to the sums of each row: of conj(U) times the field (re, im) and of the field's square,
 * 48 bytes a row, even and odd inputs apart. target: a panel of U.
 */
export function accumulatePanel(modes: i32, panel: usize, target: usize, sums: usize): void {
  const end = panel + usize(modes) * ROW;
  for (; panel < end; panel += ROW) {
    let re = v128.load(sums);
    let im = v128.load(sums, 16);
    let power = v128.load(sums, 32);
    for (let place: usize = 0; place < ROW; place += 32) {
      const x = v128.load(panel + place);
      const y = v128.load(panel + place, 16);
      const c = v128.load(target + place);
      const d = v128.load(target + place, 16);
      re = add(re, overlapRe(x, y, c, d));
      im = add(im, overlapIm(x, y, c, d));
      power = add(power, square(x, y));
    }
    v128.store(sums, re);
    v128.store(sums, im, 16);
    v128.store(sums, power, 32);
    target += ROW;
    sums += SUMS;
  }
}

/** The sum over even and odd inputs. */
@inline function wholeSum(at: usize): f64 { return load<f64>(at) + load<f64>(at, 8); }

/**
 * Runs all panels of one trial and judges it. factors: what composeCells left at the outputs; output: 2 x 16
 * bytes a port, facets and port phases. result (one lane of 4 x 16 bytes): Re and Im of Tr(U^dag V), Tr(V^dag
 * V), and the sum over the outputs of |(V U^dag)_ii|.
 */
export function judgeTrial(
  modes: i32, columns: i32, lane: i32, ranges: usize, upperPort: usize, coefficients: usize, panel: usize,
  target: usize, sums: usize, factors: usize, output: usize, result: usize,
): void {
  memory.fill(sums, 0, usize(modes) * SUMS);
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
    const x = wholeSum(sums);
    const y = wholeSum(sums + 16);
    const factorPower = re * re + im * im;
    traceRe += re * x - im * y;
    traceIm += re * y + im * x;
    power += factorPower * wholeSum(sums + 32);
    portSum += sqrt(factorPower * (x * x + y * y));
    factors += 32;
    output += 32;
    sums += SUMS;
  }
  store<f64>(result + laneBytes, traceRe);
  store<f64>(result + laneBytes, traceIm, 16);
  store<f64>(result + laneBytes, power, 32);
  store<f64>(result + laneBytes, portSum, 48);
}

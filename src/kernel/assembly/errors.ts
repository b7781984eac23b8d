// From random numbers to the splitters and phases of two sampled chips.

import { add, both, cosine, multiply, productIm, productRe, root, sine, subtract } from './lanes';

/**
 * Makes the numbers of a grid of `columns` x `rows` places dependent on each other: their covariance becomes
 * columnStep^|dc| rowStep^|dr| (a product of two first-order autoregressions: positive definite by
 * construction, variance kept). Place (c, r) stands at index c * rows + r.
 */
export function correlateGrid(grid: usize, columns: i32, rows: i32, columnStep: f64, rowStep: f64): void {
  const alongRow = both(rowStep);
  const freshRow = both(sqrt(1.0 - rowStep * rowStep));
  const alongColumn = both(columnStep);
  const freshColumn = both(sqrt(1.0 - columnStep * columnStep));
  const columnBytes = usize(rows) * 16;
  for (let c = 0; c < columns; c++) {
    const start = grid + usize(c) * columnBytes;
    for (let r = 1; r < rows; r++) {
      const at = start + usize(r) * 16;
      v128.store(at, add(multiply(alongRow, v128.load(at - 16)), multiply(freshRow, v128.load(at))));
    }
  }
  for (let c = 1; c < columns; c++) {
    const start = grid + usize(c) * columnBytes;
    for (let r = 0; r < rows; r++) {
      const at = start + usize(r) * 16;
      v128.store(at, add(multiply(alongColumn, v128.load(at - columnBytes)), multiply(freshColumn, v128.load(at))));
    }
  }
}

/**
 * Picks the numbers of `count` places (indices at `places`) from a grid; they are written `stride` bytes
 * apart.
 */
export function pickPlaces(out: usize, stride: i32, grid: usize, places: usize, count: i32): void {
  for (let k = 0; k < count; k++) {
    v128.store(out, v128.load(grid + usize(load<i32>(places + usize(k) * 4)) * 16));
    out += usize(stride);
  }
}

/**
 * Gives the two numbers of each pair the correlation `correlation`; the first is kept, both variances stay 1.
 */
export function correlatePairs(numbers: usize, pairs: i32, correlation: f64): void {
  const kept = both(correlation);
  const fresh = both(sqrt(1.0 - correlation * correlation));
  for (let k = 0; k < pairs; k++) {
    v128.store(numbers, add(multiply(kept, v128.load(numbers)), multiply(fresh, v128.load(numbers, 16))), 16);
    numbers += 32;
  }
}

/**
 * Writes the coupling ratios nominal + shift + sigma * number of `count` splitters, clamped to [0, 1], 16 bytes
 * each. `nominal`: one double a splitter, the same for both lanes. `shift`: 16 bytes. The numbers clamped are
 * added to the two 64-bit counts at `clamped`.
 */
export function drawRatios(
  ratios: usize, count: i32, nominal: usize, numbers: usize, sigma: f64, shift: usize, clamped: usize,
): void {
  const spread = both(sigma);
  const common = v128.load(shift);
  const zero = both(0.0);
  const one = both(1.0);
  let counts = v128.load(clamped);
  for (let k = 0; k < count; k++) {
    const drawn = add(add(v128.load64_splat(nominal), common), multiply(spread, v128.load(numbers)));
    // A comparison is -1 where it holds.
    counts = i64x2.sub(counts, v128.or(f64x2.lt(drawn, zero), f64x2.gt(drawn, one)));
    v128.store(ratios, f64x2.pmin(f64x2.pmax(drawn, zero), one));
    nominal += 8;
    numbers += 16;
    ratios += 16;
  }
  v128.store(clamped, counts);
}

/** Adds sigma * number to the angle a of each splitter, sin^2 a being its coupling ratio. */
export function turnRatios(ratios: usize, count: i32, numbers: usize, sigma: f64): void {
  const spread = both(sigma);
  for (let k = 0; k < count; k++) {
    const turn = multiply(spread, v128.load(numbers));
    const ratio = v128.load(ratios);
    const x = root(subtract(both(1.0), ratio));
    const y = root(ratio);
    const turned = add(multiply(y, cosine(turn)), multiply(x, sine(turn)));
    v128.store(ratios, f64x2.pmin(multiply(turned, turned), both(1.0)));
    numbers += 16;
    ratios += 16;
  }
}

/** Multiplies `count` complex factors (2 x 16 bytes, `stride` bytes apart) by e^{i sigma number}. */
export function turnFactors(factors: usize, stride: i32, count: i32, numbers: usize, sigma: f64): void {
  const spread = both(sigma);
  for (let k = 0; k < count; k++) {
    const turn = multiply(spread, v128.load(numbers));
    const c = cosine(turn);
    const s = sine(turn);
    const x = v128.load(factors);
    const y = v128.load(factors, 16);
    v128.store(factors, productRe(x, y, c, s));
    v128.store(factors, productIm(x, y, c, s), 16);
    numbers += 16;
    factors += usize(stride);
  }
}

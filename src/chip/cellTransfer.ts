import type { CellStyle, InternalArm, SplitterForm } from './Chip.js';
import { externalAtOutput } from './Chip.js';

/**
 * Writes the amplitude factors of a cell's two arms for an internal phase theta into `arms` (4 numbers: upper
 * re, im, lower re, im). `shifterLoss` is the amplitude factor of a shifter; a differential pair has one on
 * either arm.
 */
export function writeArms(
  arms: Float64Array,
  internal: InternalArm,
  theta: number,
  shifterLoss: number,
): void {
  if (internal === 'differential') {
    const c = shifterLoss * Math.cos(theta / 2);
    const s = shifterLoss * Math.sin(theta / 2);
    arms[0] = c;
    arms[1] = s;
    arms[2] = c;
    arms[3] = -s;
    return;
  }
  const shifted = internal === 'upper' ? 0 : 2;
  arms[shifted] = shifterLoss * Math.cos(theta);
  arms[shifted + 1] = shifterLoss * Math.sin(theta);
  arms[2 - shifted] = 1;
  arms[3 - shifted] = 0;
}

/**
 * Writes S(b) diag(upper arm, lower arm) S(a) into `transfer` (8 numbers: T11 re, im, T12, T21, T22), the
 * cell without its external phase and without splitter loss. sin^2 a and sin^2 b are the coupling ratios of
 * the splitters that the light meets first and second (conventions: S(a) = [[cos a, i sin a], [i sin a, cos
 * a]], or [[cos a, sin a], [sin a, -cos a]] for real splitters).
 */
export function writeSplitArms(
  transfer: Float64Array,
  form: SplitterForm,
  firstRatio: number,
  secondRatio: number,
  arms: Float64Array,
): void {
  const cosFirst = Math.sqrt(1 - firstRatio);
  const sinFirst = Math.sqrt(firstRatio);
  const cosSecond = Math.sqrt(1 - secondRatio);
  const sinSecond = Math.sqrt(secondRatio);
  const cc = cosSecond * cosFirst;
  const ss = sinSecond * sinFirst;
  const cs = cosSecond * sinFirst;
  const sc = sinSecond * cosFirst;
  const ur = arms[0]!;
  const ui = arms[1]!;
  const lr = arms[2]!;
  const li = arms[3]!;
  if (form === 'symmetric') {
    transfer[0] = cc * ur - ss * lr;
    transfer[1] = cc * ui - ss * li;
    transfer[2] = -(cs * ui + sc * li);
    transfer[3] = cs * ur + sc * lr;
    transfer[4] = -(sc * ui + cs * li);
    transfer[5] = sc * ur + cs * lr;
    transfer[6] = cc * lr - ss * ur;
    transfer[7] = cc * li - ss * ui;
  } else {
    transfer[0] = cc * ur + ss * lr;
    transfer[1] = cc * ui + ss * li;
    transfer[2] = cs * ur - sc * lr;
    transfer[3] = cs * ui - sc * li;
    transfer[4] = sc * ur - cs * lr;
    transfer[5] = sc * ui - cs * li;
    transfer[6] = ss * ur + cc * lr;
    transfer[7] = ss * ui + cc * li;
  }
}

/**
 * Multiplies the external phase into a cell's transfer matrix: on a column for a phase at the input, on a row
 * for one at the output. (re, im) is the factor of the guide that carries the shifter, loss included.
 */
export function applyExternalInPlace(
  transfer: Float64Array,
  external: CellStyle['external'],
  re: number,
  im: number,
): void {
  const first = external.startsWith('upper') ? 0 : external === 'lower-input' ? 2 : 4;
  const step = external.endsWith('input') ? 4 : 2;
  for (const at of [first, first + step]) {
    const x = transfer[at]!;
    const y = transfer[at + 1]!;
    transfer[at] = re * x - im * y;
    transfer[at + 1] = re * y + im * x;
  }
}

/**
 * Multiplies a cell's third splitter into its transfer matrix, which holds the external phase already: T S(c)
 * for an external phase at the input, S(c) T for one at the output, sin^2 c being the coupling ratio.
 * @param undone multiplies by its inverse S(c)^dag instead
 * @param at where the matrix begins
 */
export function applyOuterSplitterInPlace(
  transfer: Float64Array,
  style: CellStyle,
  ratio: number,
  undone = false,
  at = 0,
): void {
  const c = Math.sqrt(1 - ratio);
  const s = Math.sqrt(ratio);
  // Entries are taken in pairs: those of one row for a product with S on the right, of one column for one on
  // the left. S is symmetric, so both come to the same.
  const atOutput = externalAtOutput(style);
  for (let pair = 0; pair < 2; pair++) {
    const first = at + (atOutput ? 2 : 4) * pair;
    const second = first + (atOutput ? 4 : 2);
    const xr = transfer[first]!;
    const xi = transfer[first + 1]!;
    const yr = transfer[second]!;
    const yi = transfer[second + 1]!;
    if (style.splitterForm === 'real') {
      transfer[first] = c * xr + s * yr;
      transfer[first + 1] = c * xi + s * yi;
      transfer[second] = s * xr - c * yr;
      transfer[second + 1] = s * xi - c * yi;
    } else {
      const cross = undone ? -s : s;
      transfer[first] = c * xr - cross * yi;
      transfer[first + 1] = c * xi + cross * yr;
      transfer[second] = c * yr - cross * xi;
      transfer[second + 1] = c * yi + cross * xr;
    }
  }
}

import type { ComplexMatrix } from './ComplexMatrix.js';

/** Frobenius norm: square root of the sum of |entry|^2. */
export function frobeniusNorm({ re, im }: ComplexMatrix): number {
  let sum = 0;
  for (let k = 0; k < re.length; k++) sum += re[k]! ** 2 + im[k]! ** 2;
  return Math.sqrt(sum);
}

/** 1-norm: the largest sum of |entry| over a column. */
export function oneNorm({ rows, columns, re, im }: ComplexMatrix): number {
  const sums = new Float64Array(columns);
  for (let i = 0; i < rows; i++) {
    for (let j = 0; j < columns; j++) sums[j]! += Math.hypot(re[i * columns + j]!, im[i * columns + j]!);
  }
  return sums.reduce((largest, sum) => Math.max(largest, sum), 0);
}

/** max |entry| of U^dagger U - I: 0 for a unitary matrix, Infinity or NaN when an entry is. Cost n^3 / 2. */
export function unitarityDefect({ rows, columns, re, im }: ComplexMatrix): number {
  let defect = 0;
  const sumRe = new Float64Array(columns);
  const sumIm = new Float64Array(columns);
  for (let a = 0; a < columns; a++) {
    sumRe.fill(0);
    sumIm.fill(0);
    for (let k = 0; k < rows; k++) {
      const from = k * columns;
      const ar = re[from + a]!;
      const ai = im[from + a]!;
      for (let b = a; b < columns; b++) {
        const br = re[from + b]!;
        const bi = im[from + b]!;
        sumRe[b]! += ar * br + ai * bi;
        sumIm[b]! += ar * bi - ai * br;
      }
    }
    sumRe[a]! -= 1;
    // NaN must survive: Math.max keeps it, a comparison would drop it.
    for (let b = a; b < columns; b++) defect = Math.max(defect, Math.hypot(sumRe[b]!, sumIm[b]!));
  }
  return defect;
}

/**
 * Takes from one complex vector its components along others. Postcondition: `vector` is orthogonal to each
 * of the first `count` rows of `basis`, to rounding relative to its length on entry; nothing else has
 * changed. To get orthogonality relative to its length afterwards, call twice ("twice is enough", Kahan in
 * Parlett, The Symmetric Eigenvalue Problem, section 6.9).
 *
 * Modified Gram-Schmidt. The rows of `basis` are orthonormal, contiguous, `length` entries each; the vector
 * begins at `at` in its planes, which may be the planes of the basis. Cost 16 count length.
 */
export function projectOutInPlace(
  vectorRe: Float64Array,
  vectorIm: Float64Array,
  at: number,
  basisRe: Float64Array,
  basisIm: Float64Array,
  count: number,
  length: number,
): void {
  for (let row = 0; row < count; row++) {
    const from = row * length;
    let re = 0;
    let im = 0;
    for (let k = 0; k < length; k++) {
      const br = basisRe[from + k]!;
      const bi = basisIm[from + k]!;
      const vr = vectorRe[at + k]!;
      const vi = vectorIm[at + k]!;
      re += br * vr + bi * vi;
      im += br * vi - bi * vr;
    }
    for (let k = 0; k < length; k++) {
      const br = basisRe[from + k]!;
      const bi = basisIm[from + k]!;
      vectorRe[at + k]! -= re * br - im * bi;
      vectorIm[at + k]! -= re * bi + im * br;
    }
  }
}

/** Divides a vector by its length, which is returned. A vector of zeros stays as it is. */
export function normaliseInPlace(re: Float64Array, im: Float64Array, at: number, length: number): number {
  let square = 0;
  for (let k = at; k < at + length; k++) square += re[k]! * re[k]! + im[k]! * im[k]!;
  const norm = Math.sqrt(square);
  if (norm > 0) {
    for (let k = at; k < at + length; k++) {
      re[k]! /= norm;
      im[k]! /= norm;
    }
  }
  return norm;
}

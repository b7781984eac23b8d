import type { BesideFactors, MeshReach } from '../chip/MeshReach.js';

/** The nulling's factors [[c, -conj(s)], [s, c]]; in a result, in the order of the cells of the mesh. */
export interface Rotations {
  readonly cosine: Float64Array;
  readonly sineRe: Float64Array;
  readonly sineIm: Float64Array;
}

export function createRotations(count: number): Rotations {
  // One array for all three: to make an array costs as much as nulling several entries.
  const numbers = new Float64Array(3 * count);
  return {
    cosine: numbers.subarray(0, count),
    sineRe: numbers.subarray(count, 2 * count),
    sineIm: numbers.subarray(2 * count),
  };
}

/**
 * Sets rotation `at` so that c * nulled = s * kept, with s = nulled * conj(kept) / (|kept| r) and c = |kept|
 * / r, r^2 = |nulled|^2 + |kept|^2. Entries whose squares are at most `negligibleSquare` count as zero, or
 * angles would be computed from rounding noise: nothing to null (or nothing at all) is the exact bar state,
 * nothing to keep the exact cross state.
 *
 * Where the cell cannot do that, the rotation is the nearest that it can: c or |s| is raised to the least
 * that `reach` has for the cell, the phase of s kept (0 where there is none). What should vanish then keeps a
 * remainder, on which nothing later in the nulling depends.
 * @param cell index of the rotation's cell in `reach`
 */
export function setNullingRotation(
  rotations: Rotations,
  at: number,
  nulledRe: number,
  nulledIm: number,
  keptRe: number,
  keptIm: number,
  negligibleSquare: number,
  reach: MeshReach,
  cell: number,
): void {
  const nulledSquare = nulledRe * nulledRe + nulledIm * nulledIm;
  const keptSquare = keptRe * keptRe + keptIm * keptIm;
  if (nulledSquare <= negligibleSquare) {
    rotations.cosine[at] = 1;
    rotations.sineRe[at] = 0;
    rotations.sineIm[at] = 0;
  } else if (keptSquare <= negligibleSquare) {
    rotations.cosine[at] = 0;
    rotations.sineRe[at] = 1;
    rotations.sineIm[at] = 0;
  } else {
    const scale = 1 / Math.sqrt(keptSquare * (nulledSquare + keptSquare));
    rotations.cosine[at] = keptSquare * scale;
    rotations.sineRe[at] = (nulledRe * keptRe + nulledIm * keptIm) * scale;
    rotations.sineIm[at] = (nulledIm * keptRe - nulledRe * keptIm) * scale;
  }
  if (reach.beside) holdBesideInReach(rotations, at, reach, reach.beside, cell);
  else holdInReach(rotations, at, reach.leastBar[cell]!, reach.leastCross[cell]!);
}

/**
 * Moves a rotation W to the nearest one for which W Q (or Q W) is in reach. What of it is a diagonal on the
 * side where phases are free is left out, so that the result is a rotation again.
 */
function holdBesideInReach(
  rotations: Rotations,
  at: number,
  { leastBar, leastCross }: MeshReach,
  { matrices, onLeft }: BesideFactors,
  cell: number,
): void {
  const [c, sr, si] = [rotations.cosine[at]!, rotations.sineRe[at]!, rotations.sineIm[at]!];
  const rotation: Entries = [
    [c, 0],
    [-sr, si],
    [sr, si],
    [c, 0],
  ];
  const beside = entriesAt(matrices, 8 * cell);
  const judged = onLeft ? product(beside, rotation) : product(rotation, beside);
  const [bar, cross] = [Math.hypot(...judged[0]), Math.hypot(...judged[1])];
  const [least, leastOther] = [leastBar[cell]!, leastCross[cell]!];
  if (bar >= least && cross >= leastOther) return;
  const newBar = bar < least ? least : Math.max(least, Math.sqrt((1 - leastOther) * (1 + leastOther)));
  const newCross = bar < least ? Math.max(leastOther, Math.sqrt((1 - least) * (1 + least))) : leastOther;
  const [diagonal, across] = [resized(judged[0], newBar), resized(judged[1], newCross)];
  // The lower row of a unitary follows from the upper one and the determinant, which stays what it is.
  const determinant = determinantOf(judged);
  const held: Entries = [
    diagonal,
    across,
    times(determinant, minusConjugate(across)),
    times(determinant, conjugate(diagonal)),
  ];
  const moved = onLeft ? product(adjoint(beside), held) : product(held, adjoint(beside));
  const [, , lower, last] = moved;
  const free = onLeft ? moved[0] : last;
  const sine = times(lower, conjugate(resized(free, 1)));
  rotations.cosine[at] = Math.hypot(...last);
  rotations.sineRe[at] = sine[0];
  rotations.sineIm[at] = sine[1];
}

/**
 * Moves a rotation to the nearest one with c >= `leastBar` and |s| >= `leastCross`. The other amplitude is
 * held too, since a cell that cannot be moved has no room for rounding.
 */
function holdInReach(
  { cosine, sineRe, sineIm }: Rotations,
  at: number,
  leastBar: number,
  leastCross: number,
): void {
  const c = cosine[at]!;
  const sr = sineRe[at]!;
  const si = sineIm[at]!;
  const sineSquare = sr * sr + si * si;
  if (c < leastBar) {
    const sine = Math.max(leastCross, Math.sqrt((1 - leastBar) * (1 + leastBar)));
    const scale = sine / Math.sqrt(sineSquare);
    cosine[at] = leastBar;
    sineRe[at] = sr * scale;
    sineIm[at] = si * scale;
  } else if (sineSquare < leastCross * leastCross) {
    const scale = leastCross / Math.sqrt(sineSquare);
    cosine[at] = Math.max(leastBar, Math.sqrt((1 - leastCross) * (1 + leastCross)));
    sineRe[at] = sineSquare > 0 ? sr * scale : leastCross;
    sineIm[at] = sineSquare > 0 ? si * scale : 0;
  }
}

/** A complex number. */
type Complex = readonly [re: number, im: number];
/** Entries 11, 12, 21, 22 of a 2x2 matrix. */
type Entries = readonly [Complex, Complex, Complex, Complex];

const times = ([a, b]: Complex, [c, d]: Complex): Complex => [a * c - b * d, a * d + b * c];
const plus = ([a, b]: Complex, [c, d]: Complex): Complex => [a + c, b + d];
const conjugate = ([a, b]: Complex): Complex => [a, -b];
const minusConjugate = ([a, b]: Complex): Complex => [-a, b];

/** The number with another modulus; real and positive where it has no argument. */
function resized(z: Complex, modulus: number): Complex {
  const length = Math.hypot(...z);
  return length > 0 ? [(z[0] / length) * modulus, (z[1] / length) * modulus] : [modulus, 0];
}

function product([a, b, c, d]: Entries, [e, f, g, h]: Entries): Entries {
  return [
    plus(times(a, e), times(b, g)),
    plus(times(a, f), times(b, h)),
    plus(times(c, e), times(d, g)),
    plus(times(c, f), times(d, h)),
  ];
}

function adjoint([a, b, c, d]: Entries): Entries {
  return [conjugate(a), conjugate(c), conjugate(b), conjugate(d)];
}

function determinantOf([a, b, c, d]: Entries): Complex {
  const [re, im] = times(b, c);
  return plus(times(a, d), [-re, -im]);
}

function entriesAt(matrices: Float64Array, at: number): Entries {
  const entry = (k: number): Complex => [matrices[at + 2 * k]!, matrices[at + 2 * k + 1]!];
  return [entry(0), entry(1), entry(2), entry(3)];
}

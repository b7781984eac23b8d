import type { MeshReach } from '../chip/MeshReach.js';

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
  holdInReach(rotations, at, reach.leastBar[cell]!, reach.leastCross[cell]!);
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

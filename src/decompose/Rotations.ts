/** Growing list of the nulling's factors [[c, -conj(s)], [s, c]], in the order of the cells of the mesh. */
export interface Rotations {
  readonly cosine: Float64Array;
  readonly sineRe: Float64Array;
  readonly sineIm: Float64Array;
}

export function createRotations(count: number): Rotations {
  return {
    cosine: new Float64Array(count),
    sineRe: new Float64Array(count),
    sineIm: new Float64Array(count),
  };
}

/**
 * Sets rotation `at` so that c * nulled = s * kept, with s = nulled * conj(kept) / (|kept| r) and c = |kept| / r, r^2 =
 * |nulled|^2 + |kept|^2. Entries no larger than `negligible` count as zero, or angles would be computed from
 * rounding noise: nothing to null (or nothing at all) is the exact bar state, nothing to keep the exact cross state.
 */
export function setNullingRotation(
  rotations: Rotations,
  at: number,
  nulledRe: number,
  nulledIm: number,
  keptRe: number,
  keptIm: number,
  negligible: number,
): void {
  const nulled = Math.sqrt(nulledRe * nulledRe + nulledIm * nulledIm);
  const kept = Math.sqrt(keptRe * keptRe + keptIm * keptIm);
  if (nulled <= negligible) {
    rotations.cosine[at] = 1;
    rotations.sineRe[at] = 0;
    rotations.sineIm[at] = 0;
  } else if (kept <= negligible) {
    rotations.cosine[at] = 0;
    rotations.sineRe[at] = 1;
    rotations.sineIm[at] = 0;
  } else {
    const length = Math.sqrt(nulled * nulled + kept * kept);
    const scale = 1 / (kept * length);
    rotations.cosine[at] = kept / length;
    rotations.sineRe[at] = (nulledRe * keptRe + nulledIm * keptIm) * scale;
    rotations.sineIm[at] = (nulledIm * keptRe - nulledRe * keptIm) * scale;
  }
}

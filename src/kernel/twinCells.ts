import type { Kernels } from './loadKernels.js';
import type { TwinMemory } from './twinMemory.js';
import { LANES } from './twinMemory.js';

/** A complex number: re, im. */
type Complex = readonly [re: number, im: number];
/** T11, T12, T21, T22. */
type Ways = readonly [Complex, Complex, Complex, Complex];

const product = ([a, b]: Complex, [c, d]: Complex): Complex => [a * c - b * d, a * d + b * c];
const square = ([a, b]: Complex): number => a * a + b * b;

/** z / w as z conj(w) times 1/|w|^2. */
function quotient([a, b]: Complex, w: Complex): Complex {
  const inverse = 1 / square(w);
  return [(a * w[0] + b * w[1]) * inverse, (b * w[0] - a * w[1]) * inverse];
}

/**
 * T11, T12, T21, T22 of S(b) diag(upper, lower) S(a); the products of cosines and sines are of the second
 * splitter, then the first.
 */
function splitArms(
  [cosFirst, sinFirst, cosSecond, sinSecond]: readonly [number, number, number, number],
  [ur, ui]: Complex,
  [lr, li]: Complex,
  realSplitters: boolean,
): Ways {
  const cc = cosSecond * cosFirst;
  const ss = sinSecond * sinFirst;
  const cs = cosSecond * sinFirst;
  const sc = sinSecond * cosFirst;
  if (realSplitters) {
    return [
      [cc * ur + ss * lr, cc * ui + ss * li],
      [cs * ur - sc * lr, cs * ui - sc * li],
      [sc * ur - cs * lr, sc * ui - cs * li],
      [ss * ur + cc * lr, ss * ui + cc * li],
    ];
  }
  return [
    [cc * ur - ss * lr, cc * ui - ss * li],
    [-(cs * ui + sc * li), cs * ur + sc * lr],
    [-(sc * ui + cs * li), sc * ur + cs * lr],
    [cc * lr - ss * ur, cc * li - ss * ui],
  ];
}

/** The ways through a cell with its external phase and its third splitter. */
function throughOuter(
  [t11, t12, t21, t22]: Ways,
  phase: Complex,
  ratio: number,
  place: number,
  realSplitters: boolean,
): Ways {
  const [c, s] = [Math.sqrt(1 - ratio), Math.sqrt(ratio)];
  const mixed = ([xr, xi]: Complex, [yr, yi]: Complex): [Complex, Complex] =>
    realSplitters
      ? [
          [c * xr + s * yr, c * xi + s * yi],
          [s * xr - c * yr, s * xi - c * yi],
        ]
      : [
          [c * xr - s * yi, c * xi + s * yr],
          [c * yr - s * xi, c * yi + s * xr],
        ];
  const turned = (way: Complex, places: readonly number[]): Complex =>
    places.includes(place) ? product(way, phase) : way;
  const [u11, u12, u21, u22] = [
    turned(t11, [0, 2]),
    turned(t12, [1, 2]),
    turned(t21, [0, 3]),
    turned(t22, [1, 3]),
  ];
  if (place < 2) return [...mixed(u11, u12), ...mixed(u21, u22)];
  const [[v11, v21], [v12, v22]] = [mixed(u11, u21), mixed(u12, u22)];
  return [v11, v12, v21, v22];
}

/** Cells whose ways the compiled kernel finds before it goes on, and the doubles of one. */
const BLOCK = 16;
const WAY = 8 * LANES;
const ALL_BITS = 2n ** 64n - 1n;

/**
 * Twin of composeCells in assembly/composeCells.ts: a cell as T = diag(g1, g2) [[1, u], [v, 1]] of what the
 * panels hold, columns exchanged where more light crosses than stays. Every field is a factor of its guide
 * times what the panels hold, so that g1, g2 go into the factors of the guides and only u, v act on the
 * panels.
 */
export function twinCells(memory: () => TwinMemory): Pick<Kernels, 'composeCells'> {
  const composeCells: Kernels['composeCells'] = (
    cells,
    upperPort,
    ratios,
    arms,
    external,
    gain,
    modes,
    input,
    factors,
    ways,
    coefficients,
    place,
    realSplitters,
    splitters,
  ) => {
    const { doubles, integers, words } = memory();
    const hasOuter = splitters === 3;
    const atOutput = place >= 2;
    const firstPlace = hasOuter && !atOutput ? LANES : 0;
    const outerPlace = atOutput ? 2 * LANES : 0;
    // With a third splitter the external phase is in the ways through the cell.
    const onGuide = hasOuter ? -1 : place;
    doubles.copyWithin(factors / 8, input / 8, input / 8 + 4 * modes);
    const complexAt = (at: number): Complex => [doubles[at]!, doubles[at + LANES]!];
    const writeAt = (at: number, [re, im]: Complex): void => {
      doubles[at] = re;
      doubles[at + LANES] = im;
    };
    for (let cell = 0; cell < cells; cell++) {
      for (let lane = 0; lane < LANES; lane++) {
        const ofCell = ratios / 8 + LANES * splitters * cell + lane;
        const [first, second] = complexAt(ofCell + firstPlace);
        const amplitude = doubles[gain / 8 + LANES * cell + lane]!;
        const arm = arms / 8 + 8 * cell + lane;
        const phase = complexAt(external / 8 + 4 * cell + lane);
        const aroundArms = splitArms(
          [
            Math.sqrt(1 - first),
            Math.sqrt(first),
            amplitude * Math.sqrt(1 - second),
            amplitude * Math.sqrt(second),
          ],
          complexAt(arm),
          complexAt(arm + 4),
          realSplitters !== 0,
        );
        const [t11, t12, t21, t22] = hasOuter
          ? throughOuter(aroundArms, phase, doubles[ofCell + outerPlace]!, place, realSplitters !== 0)
          : aroundArms;
        // What the compiled kernel keeps of the cells of a block.
        const kept = ways / 8 + WAY * (cell % BLOCK) + lane;
        [t11, t12, t21, t22].forEach((way, k) => writeAt(kept + 2 * LANES * k, way));
        const port = factors / 8 + 4 * integers[upperPort / 4 + cell]! + lane;
        const f1 = onGuide === 0 ? product(complexAt(port), phase) : complexAt(port);
        const f2 = onGuide === 1 ? product(complexAt(port + 4), phase) : complexAt(port + 4);

        // The larger entry of each row is made the row's factor.
        const exchanged = square(t12) > square(t11);
        const [a11, a12] = [product(t11, f1), product(t12, f2)];
        const [a21, a22] = [product(t21, f1), product(t22, f2)];
        const [g1, h1] = exchanged ? [a12, a11] : [a11, a12];
        const [g2, h2] = exchanged ? [a21, a22] : [a22, a21];
        const at = coefficients / 8 + 10 * cell + lane;
        writeAt(at, quotient(h1, g1));
        writeAt(at + 4, quotient(h2, g2));
        words[at + 8] = exchanged ? ALL_BITS : 0n;
        writeAt(port, onGuide === 2 ? product(g1, phase) : g1);
        writeAt(port + 4, onGuide === 3 ? product(g2, phase) : g2);
      }
    }
  };
  return { composeCells };
}

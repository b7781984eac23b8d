import type { Kernels } from './loadKernels.js';
import type { TwinMemory } from './twinMemory.js';
import { LANES } from './twinMemory.js';
import { twinCosine, twinSine } from './twinSine.js';

type ErrorKernels = Pick<
  Kernels,
  'correlateGrid' | 'pickPlaces' | 'correlatePairs' | 'drawRatios' | 'turnRatios' | 'turnFactors'
>;

/** Twins of assembly/errors.ts. */
export function twinErrors(memory: () => TwinMemory): ErrorKernels {
  /** Covariance columnStep^|dc| rowStep^|dr| on a grid; the two lanes of a place are neighbours. */
  const correlateGrid: Kernels['correlateGrid'] = (grid, columns, rows, columnStep, rowStep) => {
    const { doubles } = memory();
    const freshRow = Math.sqrt(1 - rowStep * rowStep);
    const freshColumn = Math.sqrt(1 - columnStep * columnStep);
    const columnLength = LANES * rows;
    const start = grid / 8;
    for (let c = 0; c < columns; c++) {
      for (let k = LANES; k < columnLength; k++) {
        const at = start + c * columnLength + k;
        doubles[at] = rowStep * doubles[at - LANES]! + freshRow * doubles[at]!;
      }
    }
    for (let at = start + columnLength; at < start + columns * columnLength; at++) {
      doubles[at] = columnStep * doubles[at - columnLength]! + freshColumn * doubles[at]!;
    }
  };

  const pickPlaces: Kernels['pickPlaces'] = (out, stride, grid, places, count) => {
    const { doubles, integers } = memory();
    for (let k = 0; k < count; k++) {
      const place = grid / 8 + LANES * integers[places / 4 + k]!;
      doubles.copyWithin((out + k * stride) / 8, place, place + LANES);
    }
  };

  const correlatePairs: Kernels['correlatePairs'] = (numbers, pairs, correlation) => {
    const { doubles } = memory();
    const fresh = Math.sqrt(1 - correlation * correlation);
    for (let pair = 0; pair < pairs; pair++) {
      for (let lane = 0; lane < LANES; lane++) {
        const at = numbers / 8 + 2 * LANES * pair + lane;
        doubles[at + LANES] = correlation * doubles[at]! + fresh * doubles[at + LANES]!;
      }
    }
  };

  const drawRatios: Kernels['drawRatios'] = (ratios, count, nominal, numbers, sigma, shift, clamped) => {
    const { doubles, words } = memory();
    for (let k = 0; k < count; k++) {
      for (let lane = 0; lane < LANES; lane++) {
        const common = doubles[nominal / 8 + k]! + doubles[shift / 8 + lane]!;
        const drawn = common + sigma * doubles[numbers / 8 + LANES * k + lane]!;
        if (drawn < 0 || drawn > 1) words[clamped / 8 + lane]!++;
        doubles[ratios / 8 + LANES * k + lane] = drawn < 0 ? 0 : drawn > 1 ? 1 : drawn;
      }
    }
  };

  const turnRatios: Kernels['turnRatios'] = (ratios, count, numbers, sigma) => {
    const { doubles } = memory();
    for (let k = 0; k < LANES * count; k++) {
      const turn = sigma * doubles[numbers / 8 + k]!;
      const ratio = doubles[ratios / 8 + k]!;
      const turned = Math.sqrt(ratio) * twinCosine(turn) + Math.sqrt(1 - ratio) * twinSine(turn);
      doubles[ratios / 8 + k] = Math.min(turned * turned, 1);
    }
  };

  const turnFactors: Kernels['turnFactors'] = (factors, stride, count, numbers, sigma) => {
    const { doubles } = memory();
    for (let k = 0; k < count; k++) {
      for (let lane = 0; lane < LANES; lane++) {
        const turn = sigma * doubles[numbers / 8 + LANES * k + lane]!;
        const c = twinCosine(turn);
        const s = twinSine(turn);
        const at = (factors + k * stride) / 8 + lane;
        const x = doubles[at]!;
        const y = doubles[at + LANES]!;
        doubles[at] = x * c - y * s;
        doubles[at + LANES] = x * s + y * c;
      }
    }
  };

  return { correlateGrid, pickPlaces, correlatePairs, drawRatios, turnRatios, turnFactors };
}

import type { KernelInstance, Kernels } from './loadKernels.js';
import { twinCarry } from './twinCarry.js';
import { twinCells } from './twinCells.js';
import { twinErrors } from './twinErrors.js';
import type { TwinMemory } from './twinMemory.js';
import { twinMemory } from './twinMemory.js';
import { twinNumbers } from './twinNumbers.js';
import { twinPanels } from './twinPanels.js';

/**
 * Kernels whose readable twins stand higher up, in other terms than memory: the cell solver of a chip, the
 * nullings of a decomposition.
 */
type ForeignKernels = Pick<Kernels, 'solveCells' | 'layOutMatrix' | 'nullRectangular' | 'nullTriangular'>;

const absent = (): never => {
  throw new Error('this kernel has no twin on memory; its readable twin stands in chip/ or decompose/');
};

/**
 * An instance whose trial kernels are plain TypeScript on a plain buffer: the same operations in the same
 * order as the compiled ones, hence the same bits, for tests and for pages without WebAssembly. 25
 * to 150 times slower.
 *
 * The kernel contract holds: addresses are multiples of 16 bytes, arrays do not overlap, and views from
 * before a reservation may be dead.
 * @param foreign kernels that have no twin on memory; those left out throw when they are called
 */
export function twinInstance(foreign: Partial<ForeignKernels> = {}): KernelInstance {
  let views: TwinMemory = twinMemory(new ArrayBuffer(65536));
  const memory = (): TwinMemory => views;
  let next = 0;
  const reserveBytes = (bytes: number): number => {
    const address = next;
    next += Math.ceil(bytes / 64) * 64 + 64;
    if (next > views.bytes.length) {
      const larger = twinMemory(new ArrayBuffer(2 ** Math.ceil(Math.log2(next))));
      larger.bytes.set(views.bytes);
      views = larger;
    }
    return address;
  };
  return {
    kernels: {
      ...twinNumbers(memory),
      ...twinErrors(memory),
      ...twinCells(memory),
      ...twinPanels(memory),
      ...twinCarry(memory),
      solveCells: absent,
      layOutMatrix: absent,
      nullRectangular: absent,
      nullTriangular: absent,
      ...foreign,
    },
    reserve: (doubles) => reserveBytes(8 * doubles),
    reserveBytes,
    doubles: (address, length) => new Float64Array(views.bytes.buffer, address, length),
    integers: (address, length) => new Int32Array(views.bytes.buffer, address, length),
    bytes: (address, length) => new Uint8Array(views.bytes.buffer, address, length),
  };
}

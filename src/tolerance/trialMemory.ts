import { splitterCount } from '../chip/cellSplitters.js';
import type { Chip } from '../chip/Chip.js';
import type { KernelInstance } from '../kernel/loadKernels.js';
import { BLOCK_SIZE } from '../kernel/loadKernels.js';
import { writeZiggurat, ZIGGURAT_SIZE } from '../kernel/ziggurat.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { reachedCells } from '../mesh/reachedCells.js';

/** Input ports that the kernels propagate at a time. */
const PANEL = 8;

/** Addresses of the arrays of two trials side by side; what stands in them is said in src/kernel/assembly. */
export interface TrialMemory {
  readonly upperPort: number;
  readonly places: number;
  readonly nominal: number;
  readonly state: number;
  readonly layers: number;
  readonly numbers: number;
  readonly grid: number;
  readonly shift: number;
  readonly clamped: number;
  readonly ratios: number;
  readonly wanted: number;
  readonly diagonal: number;
  readonly diagonalAt: number;
  readonly carried: number;
  readonly block: number;
  readonly arms: number;
  readonly external: number;
  readonly gain: number;
  readonly factors: number;
  readonly output: number;
  readonly coefficients: number;
  readonly ranges: number;
  readonly panel: number;
  readonly targets: readonly [number, number];
  readonly sums: number;
  readonly result: number;
}

/** Reserves the arrays and fills in those that never change: places of the cells and what light can reach. */
export function reserveTrialMemory(instance: KernelInstance, chip: Chip, correlated: boolean): TrialMemory {
  const { modes, cells, columns, upperPortIndex, columnIndex } = chip.mesh;
  const panels = Math.ceil(modes / PANEL);
  const splitters = splitterCount(chip);
  const reserve = (doubles: number): number => instance.reserve(doubles);
  const reserveBytes = (bytes: number): number => instance.reserveBytes(bytes);
  const targetSize = 2 * PANEL * modes * panels;
  // Two lanes a number.
  const memory: TrialMemory = {
    upperPort: reserveBytes(4 * cells),
    places: reserveBytes(4 * cells),
    nominal: reserve(splitters),
    state: reserve(4),
    layers: reserve(ZIGGURAT_SIZE),
    numbers: reserve(2 * Math.max(splitters, modes, 2)),
    grid: reserve(correlated ? 2 * columns * modes : 0),
    shift: reserve(2),
    clamped: reserve(2),
    ratios: reserve(2 * splitters),
    wanted: reserve(8 * cells),
    diagonal: reserve(4 * modes),
    diagonalAt: reserveBytes(4 * modes),
    carried: reserve(4 * modes),
    block: reserve(BLOCK_SIZE),
    arms: reserve(8 * cells),
    external: reserve(4 * cells),
    gain: reserve(2 * cells),
    factors: reserve(4 * modes),
    output: reserve(4 * modes),
    coefficients: reserve(10 * cells),
    ranges: reserveBytes(8 * columns * panels),
    panel: reserve(2 * PANEL * modes),
    targets: [reserve(targetSize), reserve(targetSize)],
    sums: reserve(6 * modes),
    result: reserve(8),
  };
  instance.integers(memory.upperPort, cells).set(upperPortIndex);
  instance
    .integers(memory.places, cells)
    .set(upperPortIndex.map((port, cell) => columnIndex[cell]! * modes + port));
  instance.doubles(memory.nominal, splitters).set(chip.couplingRatios);
  writeZiggurat(instance.doubles(memory.layers, ZIGGURAT_SIZE));
  instance.integers(memory.ranges, 2 * columns * panels).set(reachedByPanels(chip));
  return memory;
}

/** What the light of each panel of inputs can have reached, panel after panel. */
function reachedByPanels({ mesh }: Chip): Int32Array {
  const ranges: number[] = [];
  for (let input = 0; input < mesh.modes; input += PANEL) {
    ranges.push(...reachedCells(mesh, input, Math.min(mesh.modes, input + PANEL) - 1));
  }
  return Int32Array.from(ranges);
}

/** Writes a target in panels of eight columns; a row holds real and imaginary parts of two columns in turns. */
export function writeTarget(
  instance: KernelInstance,
  address: number,
  { rows: modes, re, im }: ComplexMatrix,
): void {
  const panels = Math.ceil(modes / PANEL);
  const out = instance.doubles(address, 2 * PANEL * modes * panels);
  for (let row = 0; row < modes; row++) {
    for (let column = 0; column < modes; column++) {
      const panel = Math.floor(column / PANEL);
      const within = column % PANEL;
      const at = (panel * modes + row) * 2 * PANEL + within + 2 * (within >> 1);
      out[at] = re[row * modes + column]!;
      out[at + 2] = im[row * modes + column]!;
    }
  }
}

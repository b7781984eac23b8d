import type { CellSlopes } from '../chip/cellSlopes.js';
import { createCellSlopes } from '../chip/cellSlopes.js';
import type { Chip } from '../chip/Chip.js';
import { externalAtOutput } from '../chip/Chip.js';
import { shifterCount, shifterIndexOfPort, shifterIndicesOfCell } from '../chip/shifters.js';
import type { KernelInstance } from '../kernel/loadKernels.js';
import { loadKernels } from '../kernel/loadKernels.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { zeroMatrix } from '../matrix/ComplexMatrix.js';
import type { Mesh } from '../mesh/Mesh.js';
import { reachedCells } from '../mesh/reachedCells.js';

/**
 * Light through a chip and back: the transfer matrix of some of its inputs, and the gradient by all phases of
 * whatever is made of that matrix. Phases and gradients are in the order of the phase table. Holds a kernel
 * memory of its own.
 */
export interface FieldSweep {
  /**
   * The columns of the chosen inputs of the transfer matrix V, losses included: N x n, the same as those of
   * `simulate`. Overwritten by the next call. Cost (56/3) N^3 flops for all inputs.
   * @throws RangeError when there is not one phase per shifter
   */
  forward(phases: Float64Array): ComplexMatrix;
  /**
   * Writes the derivatives of a cost by all phases, at the phases of the last call of `forward`.
   * @throws RangeError when the gradient has not one number per shifter
   * @param slope the cost's derivatives G by the entries of V: d cost = sum of Re(conj(G_ij) dV_ij)
   */
  backward(slope: ComplexMatrix, gradient: Float64Array): void;
}

/** Input ports that the kernels carry at a time, and doubles of a row of such a panel. */
const PANEL = 8;
const ROW = 2 * PANEL;
/** Doubles of what a cell's rows were before it, of its matrix, of its correlations. */
const HISTORY = 2 * ROW;
const CELL = 8;
/**
 * Most bytes of history that are kept for all panels; above, each panel goes forward once more before it goes
 * back. Measured.
 */
const MOST_HISTORY = 2 ** 23;

/** Kernel memory of a sweep, laid out for a mesh and a choice of inputs. One sweep at a time may use it. */
export interface FieldMemory {
  readonly instance: KernelInstance;
  readonly mesh: Mesh;
  readonly inputs: readonly number[];
  /** Whether fields are kept for the way back, or made anew. */
  readonly keepsFields: boolean;
  /** Number of cells that each panel meets. */
  readonly met: readonly number[];
  /** Addresses. */
  readonly at: {
    readonly upperPort: number;
    readonly ranges: number;
    readonly transfers: number;
    readonly correlations: number;
    readonly panel: number;
    readonly history: number;
  };
}

/**
 * Reserves the memory of sweeps through chips of one mesh, so that many chips can be treated one after the
 * other in the same memory.
 * @param inputs indices (from 0) of the inputs whose columns are wanted, each once
 * @param instance kernels to use; nothing else may be reserved on it while the memory is in use
 * @param keeps whether fields are kept for the way back; null: according to the size
 */
export function reserveFieldMemory(
  mesh: Mesh,
  inputs: readonly number[],
  instance: KernelInstance = loadKernels(),
  keeps: boolean | null = null,
): FieldMemory {
  const { modes, cells, columns, upperPortIndex } = mesh;
  const ranges = rangesOfPanels(mesh, inputs);
  const met = cellsMet(ranges, columns, Math.ceil(inputs.length / PANEL));
  const total = met.reduce((sum, cellsOfPanel) => sum + cellsOfPanel, 0);
  const keepsFields = keeps ?? 8 * HISTORY * total <= MOST_HISTORY;
  const at = {
    upperPort: instance.reserveBytes(4 * cells),
    ranges: instance.reserveBytes(4 * ranges.length),
    transfers: instance.reserve(CELL * cells),
    correlations: instance.reserve(CELL * cells),
    panel: instance.reserve(ROW * modes),
    history: instance.reserve(HISTORY * (keepsFields ? total : Math.max(0, ...met))),
  };
  instance.integers(at.upperPort, cells).set(upperPortIndex);
  instance.integers(at.ranges, ranges.length).set(ranges);
  return { instance, mesh, inputs, keepsFields, met, at };
}

/**
 * Makes a sweep for a chip.
 *
 * With T_k the matrix of cell k, x the fields before it and y the adjoint fields behind it (the conjugate
 * transpose of all that follows, times G), the derivative by a phase p of the cell is Re sum_ab (dT_k/dp)_ab
 * M_ab with the correlations M_ab = sum over inputs of conj(y_a) x_b: the kernels carry fields and sum up M,
 * and what a phase does to a cell is chip/cellSlopes alone.
 *
 * @param memory of the chip's mesh
 */
export function createFieldSweep(chip: Chip, memory: FieldMemory): FieldSweep {
  const { instance, inputs, keepsFields: keeps, met, at } = memory;
  const { kernels } = instance;
  const { modes, cells, columns } = chip.mesh;
  const count = inputs.length;
  const panels = met.length;
  const total = met.reduce((sum, cellsOfPanel) => sum + cellsOfPanel, 0);
  const correlations = instance.doubles(at.correlations, CELL * cells);
  const panel = instance.doubles(at.panel, ROW * modes);
  const slopes: CellSlopes = {
    transfer: instance.doubles(at.transfers, CELL * cells),
    byInternal: new Float64Array(CELL * cells),
    byExternal: new Float64Array(CELL * cells),
  };
  const writeSlopes = createCellSlopes(chip);
  const places = placesOfPhases(chip);
  const ends = createEnds(chip);
  const fields = zeroMatrix(modes, count);

  /** Puts light of amplitude 1 before the facets of a panel's inputs. */
  function lightUp(number: number): void {
    panel.fill(0);
    for (let k = 0; k < PANEL && number * PANEL + k < count; k++) {
      const port = inputs[number * PANEL + k]!;
      panel[port * ROW + k] = ends.input[2 * port]!;
      panel[port * ROW + k + PANEL] = ends.input[2 * port + 1]!;
    }
  }

  function carry(number: number, history: number, keepsNow: boolean): void {
    const reached = at.ranges + 8 * columns * number;
    kernels.carryFields(columns, reached, at.upperPort, at.transfers, at.panel, history, keepsNow ? 1 : 0);
  }

  function setCells(phases: Float64Array): void {
    for (let cell = 0; cell < cells; cell++) {
      writeSlopes(slopes, cell, phases[places.internal[cell]!]!, phases[places.external[cell]!]!);
    }
  }

  function requireOnePerShifter(numbers: Float64Array): void {
    if (numbers.length !== shifterCount(chip)) {
      throw new RangeError(`the chip has ${shifterCount(chip)} shifters, not ${numbers.length}`);
    }
  }

  return {
    forward: (phases) => {
      requireOnePerShifter(phases);
      setCells(phases);
      ends.set(phases);
      let history = at.history;
      for (let number = 0; number < panels; number++) {
        lightUp(number);
        carry(number, history, keeps);
        if (keeps) history += 8 * HISTORY * met[number]!;
        readPanel(panel, ends.output, fields, number);
      }
      return fields;
    },
    backward: (slope, gradient) => {
      requireOnePerShifter(gradient);
      gradient.fill(0);
      correlations.fill(0);
      let history = at.history + (keeps ? 8 * HISTORY * total : 0);
      for (let number = panels - 1; number >= 0; number--) {
        if (!keeps) {
          lightUp(number);
          carry(number, at.history, true);
          history = at.history + 8 * HISTORY * met[number]!;
        }
        writePanel(panel, ends.output, slope, number);
        const reached = at.ranges + 8 * columns * number;
        kernels.carryAdjoints(
          columns,
          reached,
          at.upperPort,
          at.transfers,
          at.panel,
          history,
          at.correlations,
        );
        if (keeps) history -= 8 * HISTORY * met[number]!;
        if (places.port !== null && ends.portAtInput) addInputSlopes(gradient, number);
      }
      if (places.port !== null && !ends.portAtInput) addOutputSlopes(gradient, slope);
      for (let cell = 0; cell < cells; cell++) {
        gradient[places.internal[cell]!] = realProduct(slopes.byInternal, correlations, CELL * cell);
        gradient[places.external[cell]!] = realProduct(slopes.byExternal, correlations, CELL * cell);
      }
    },
  };

  /** A phase p on a field x has dx/dp = i x, so d cost/dp = Re(conj(y) i x) with y the adjoint field. */
  function addInputSlopes(gradient: Float64Array, number: number): void {
    for (let k = 0; k < PANEL && number * PANEL + k < count; k++) {
      const port = inputs[number * PANEL + k]!;
      const [re, im] = [panel[port * ROW + k]!, panel[port * ROW + k + PANEL]!];
      gradient[places.port![port]!]! += im * ends.input[2 * port]! - re * ends.input[2 * port + 1]!;
    }
  }

  function addOutputSlopes(gradient: Float64Array, slope: ComplexMatrix): void {
    for (let port = 0; port < modes; port++) {
      let sum = 0;
      for (let k = port * count; k < (port + 1) * count; k++) {
        sum += slope.im[k]! * fields.re[k]! - slope.re[k]! * fields.im[k]!;
      }
      gradient[places.port![port]!] = sum;
    }
  }
}

/** Real part of the sum over the four entries of one product each. */
function realProduct(a: Float64Array, b: Float64Array, at: number): number {
  let sum = 0;
  for (let k = at; k < at + CELL; k += 2) sum += a[k]! * b[k]! - a[k + 1]! * b[k + 1]!;
  return sum;
}

/** Indices of all phases in the phase table's order. */
interface PlacesOfPhases {
  readonly internal: Int32Array;
  readonly external: Int32Array;
  readonly port: Int32Array | null;
}

function placesOfPhases(chip: Chip): PlacesOfPhases {
  const { cells, modes } = chip.mesh;
  const internal = new Int32Array(cells);
  const external = new Int32Array(cells);
  for (let cell = 0; cell < cells; cell++) {
    const places = shifterIndicesOfCell(chip, cell);
    internal[cell] = places.internal;
    external[cell] = places.external;
  }
  const port = chip.portShifters
    ? Int32Array.from({ length: modes }, (_, index) => shifterIndexOfPort(chip, index))
    : null;
  return { internal, external, port };
}

/** Factors of the fields before the first and behind the last column, re and im per port. */
interface Ends {
  readonly input: Float64Array;
  readonly output: Float64Array;
  readonly portAtInput: boolean;
  /** Writes the factors for the port shifters' phases. */
  set(phases: Float64Array): void;
}

function createEnds(chip: Chip): Ends {
  const { loss, mesh } = chip;
  const allColumns = loss.column ** mesh.columns;
  const portAtInput = externalAtOutput(chip.style);
  const input = new Float64Array(2 * mesh.modes);
  const output = new Float64Array(2 * mesh.modes);
  return {
    input,
    output,
    portAtInput,
    set: (phases) => {
      for (let port = 0; port < mesh.modes; port++) {
        input[2 * port] = loss.input[port]!;
        output[2 * port] = allColumns * loss.output[port]!;
        if (!chip.portShifters) continue;
        const factors = portAtInput ? input : output;
        const amplitude = loss.shifter * factors[2 * port]!;
        const phase = phases[shifterIndexOfPort(chip, port)]!;
        factors[2 * port] = amplitude * Math.cos(phase);
        factors[2 * port + 1] = amplitude * Math.sin(phase);
      }
    },
  };
}

/** What the light of each panel of inputs can have reached, panel after panel. */
function rangesOfPanels(mesh: Mesh, inputs: readonly number[]): number[] {
  const ranges: number[] = [];
  for (let first = 0; first < inputs.length; first += PANEL) {
    const ports = inputs.slice(first, first + PANEL);
    ranges.push(...reachedCells(mesh, Math.min(...ports), Math.max(...ports)));
  }
  return ranges;
}

/** Number of cells that each panel meets. */
function cellsMet(ranges: readonly number[], columns: number, panels: number): number[] {
  return Array.from({ length: panels }, (_, number) => {
    let met = 0;
    for (let k = 2 * columns * number; k < 2 * columns * (number + 1); k += 2)
      met += ranges[k + 1]! - ranges[k]!;
    return met;
  });
}

/** Takes a panel's columns out of it, times the factors of the rows. */
function readPanel(panel: Float64Array, factors: Float64Array, matrix: ComplexMatrix, number: number): void {
  const { rows, columns } = matrix;
  const first = number * PANEL;
  const count = Math.min(PANEL, columns - first);
  for (let row = 0; row < rows; row++) {
    const re = factors[2 * row]!;
    const im = factors[2 * row + 1]!;
    for (let from = row * ROW, to = row * columns + first, end = to + count; to < end; from++, to++) {
      const x = panel[from]!;
      const y = panel[from + PANEL]!;
      matrix.re[to] = re * x - im * y;
      matrix.im[to] = re * y + im * x;
    }
  }
}

/** Puts columns into a panel, times the conjugates of the factors of the rows. */
function writePanel(panel: Float64Array, factors: Float64Array, matrix: ComplexMatrix, number: number): void {
  const { rows, columns } = matrix;
  const first = number * PANEL;
  const count = Math.min(PANEL, columns - first);
  if (count < PANEL) panel.fill(0);
  for (let row = 0; row < rows; row++) {
    const re = factors[2 * row]!;
    const im = factors[2 * row + 1]!;
    for (let to = row * ROW, from = row * columns + first, end = from + count; from < end; from++, to++) {
      const x = matrix.re[from]!;
      const y = matrix.im[from]!;
      panel[to] = re * x + im * y;
      panel[to + PANEL] = re * y - im * x;
    }
  }
}

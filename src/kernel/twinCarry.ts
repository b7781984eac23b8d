import type { Kernels } from './loadKernels.js';
import type { TwinMemory } from './twinMemory.js';

/** Input ports of a panel: a row of one holds as many real parts, then as many imaginary parts. */
const PANEL = 8;
const ROW = 2 * PANEL;
/** Doubles of a cell's transfer matrix and of its correlations: 11 re, im, 12, 21, 22. */
const CELL = 8;

/** Twins of carryFields and carryAdjoints in assembly/carry.ts. */
export function twinCarry(memory: () => TwinMemory): Pick<Kernels, 'carryFields' | 'carryAdjoints'> {
  const carryFields: Kernels['carryFields'] = (
    columns,
    ranges,
    upperPort,
    transfers,
    panelAt,
    historyAt,
    keeps,
  ) => {
    const { doubles, integers } = memory();
    let history = historyAt / 8;
    for (let column = 0; column < columns; column++) {
      const [first, last] = [integers[ranges / 4 + 2 * column]!, integers[ranges / 4 + 2 * column + 1]!];
      for (let cell = first; cell < last; cell++) {
        const x = panelAt / 8 + ROW * integers[upperPort / 4 + cell]!;
        if (keeps) {
          doubles.copyWithin(history, x, x + 2 * ROW);
          history += 2 * ROW;
        }
        const at = transfers / 8 + CELL * cell;
        const [t11r, t11i, t12r, t12i] = numbersAt(doubles, at);
        const [t21r, t21i, t22r, t22i] = numbersAt(doubles, at + 4);
        for (let k = x; k < x + PANEL; k++) {
          const [a, b] = [doubles[k]!, doubles[k + PANEL]!];
          const [c, d] = [doubles[k + ROW]!, doubles[k + ROW + PANEL]!];
          doubles[k] = t11r * a - t11i * b + (t12r * c - t12i * d);
          doubles[k + PANEL] = t11r * b + t11i * a + (t12r * d + t12i * c);
          doubles[k + ROW] = t21r * a - t21i * b + (t22r * c - t22i * d);
          doubles[k + ROW + PANEL] = t21r * b + t21i * a + (t22r * d + t22i * c);
        }
      }
    }
  };

  const carryAdjoints: Kernels['carryAdjoints'] = (
    columns,
    ranges,
    upperPort,
    transfers,
    panelAt,
    historyEnd,
    correlations,
  ) => {
    const { doubles, integers } = memory();
    let history = historyEnd / 8;
    for (let column = columns - 1; column >= 0; column--) {
      const [first, last] = [integers[ranges / 4 + 2 * column]!, integers[ranges / 4 + 2 * column + 1]!];
      for (let cell = last - 1; cell >= first; cell--) {
        history -= 2 * ROW;
        const x = panelAt / 8 + ROW * integers[upperPort / 4 + cell]!;
        correlate(doubles, correlations / 8 + CELL * cell, x, history);
        const at = transfers / 8 + CELL * cell;
        const [t11r, t11i, t12r, t12i] = numbersAt(doubles, at);
        const [t21r, t21i, t22r, t22i] = numbersAt(doubles, at + 4);
        for (let k = x; k < x + PANEL; k++) {
          const [a, b] = [doubles[k]!, doubles[k + PANEL]!];
          const [c, d] = [doubles[k + ROW]!, doubles[k + ROW + PANEL]!];
          doubles[k] = t11r * a + t11i * b + (t21r * c + t21i * d);
          doubles[k + PANEL] = t11r * b - t11i * a + (t21r * d - t21i * c);
          doubles[k + ROW] = t12r * a + t12i * b + (t22r * c + t22i * d);
          doubles[k + ROW + PANEL] = t12r * b - t12i * a + (t22r * d - t22i * c);
        }
      }
    }
  };

  return { carryFields, carryAdjoints };
}

function numbersAt(doubles: Float64Array, at: number): readonly [number, number, number, number] {
  return [doubles[at]!, doubles[at + 1]!, doubles[at + 2]!, doubles[at + 3]!];
}

/**
 * Adds to a cell's correlations, at number 2 b + a (doubles 4 b + 2 a, re and im): the sum over the panel of
 * conj(adjoint on guide b, behind the cell) times the field on guide a before it.
 */
function correlate(doubles: Float64Array, at: number, adjoints: number, fields: number): void {
  for (let behind = 0; behind < 2; behind++) {
    for (let before = 0; before < 2; before++) {
      // Even and odd inputs are summed apart, as the two halves of a vector are.
      const re = [0, 0];
      const im = [0, 0];
      for (let k = 0; k < PANEL; k++) {
        const [x, y] = [doubles[fields + ROW * before + k]!, doubles[fields + ROW * before + k + PANEL]!];
        const [u, v] = [doubles[adjoints + ROW * behind + k]!, doubles[adjoints + ROW * behind + k + PANEL]!];
        re[k % 2]! += x * u + y * v;
        im[k % 2]! += y * u - x * v;
      }
      doubles[at + 4 * behind + 2 * before]! += re[0]! + re[1]!;
      doubles[at + 4 * behind + 2 * before + 1]! += im[0]! + im[1]!;
    }
  }
}

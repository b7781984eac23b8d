import type { Kernels } from './loadKernels.js';
import type { TwinMemory } from './twinMemory.js';
import { LANES } from './twinMemory.js';

/** Input ports of a panel: a row of one holds as many real parts, then as many imaginary parts. */
const PANEL = 8;
const ROW = 2 * PANEL;
/** Doubles of a cell's coefficients. */
const CELL = 5 * LANES;
/** What places hold that no light reaches. */
const DARK = 1e-40;

type PanelKernels = Pick<Kernels, 'propagatePanel' | 'accumulatePanel' | 'judgeTrial'>;

/** Twins of propagatePanel, accumulatePanel and judgeTrial in assembly/propagate.ts. */
export function twinPanels(memory: () => TwinMemory): PanelKernels {
  /** x' = x + u y, y' = y + v x on two neighbouring rows, exchanged first where light mostly crosses. */
  function mixRows(panel: Float64Array, top: number, numbers: number, exchanged: boolean): void {
    const { doubles } = memory();
    const [ur, ui] = [doubles[numbers]!, doubles[numbers + LANES]!];
    const [vr, vi] = [doubles[numbers + 2 * LANES]!, doubles[numbers + 3 * LANES]!];
    const x = exchanged ? top + ROW : top;
    const y = exchanged ? top : top + ROW;
    for (let k = 0; k < PANEL; k++) {
      const [a, b] = [panel[x + k]!, panel[x + k + PANEL]!];
      const [c, d] = [panel[y + k]!, panel[y + k + PANEL]!];
      panel[top + k] = a + (ur * c - ui * d);
      panel[top + k + PANEL] = b + (ur * d + ui * c);
      panel[top + k + ROW] = c + (vr * a - vi * b);
      panel[top + k + ROW + PANEL] = d + (vr * b + vi * a);
    }
  }

  const propagatePanel: Kernels['propagatePanel'] = (
    modes,
    columns,
    firstInput,
    lane,
    ranges,
    upperPort,
    coefficients,
    panelAt,
  ) => {
    const { doubles, integers } = memory();
    const panel = doubles.subarray(panelAt / 8, panelAt / 8 + ROW * modes).fill(DARK);
    for (let k = 0; k < Math.min(PANEL, modes - firstInput); k++) panel[(firstInput + k) * ROW + k] = 1;
    for (let column = 0; column < columns; column++) {
      const first = integers[ranges / 4 + 2 * column]!;
      const last = integers[ranges / 4 + 2 * column + 1]!;
      for (let cell = first; cell < last; cell++) {
        const numbers = coefficients / 8 + CELL * cell + lane;
        const exchanged = integers[2 * (numbers + 4 * LANES)] !== 0;
        mixRows(panel, ROW * integers[upperPort / 4 + cell]!, numbers, exchanged);
      }
    }
  };

  const accumulatePanel: Kernels['accumulatePanel'] = (modes, panel, target, sums) => {
    const { doubles } = memory();
    for (let row = 0; row < modes; row++) {
      // Even and odd inputs are summed apart, as the two halves of a vector are.
      const re = [0, 0];
      const im = [0, 0];
      const power = [0, 0];
      for (let k = 0; k < PANEL; k++) {
        const [x, y] = [doubles[panel / 8 + ROW * row + k]!, doubles[panel / 8 + ROW * row + k + PANEL]!];
        const [c, d] = [doubles[target / 8 + ROW * row + k]!, doubles[target / 8 + ROW * row + k + PANEL]!];
        re[k % 2]! += x * c + y * d;
        im[k % 2]! += y * c - x * d;
        power[k % 2]! += x * x + y * y;
      }
      [re, im, power].forEach(([even, odd], k) => (doubles[sums / 8 + 3 * row + k]! += even! + odd!));
    }
  };

  const judgeTrial: Kernels['judgeTrial'] = (
    modes,
    columns,
    lane,
    ranges,
    upperPort,
    coefficients,
    panel,
    target,
    sums,
    factors,
    output,
    result,
  ) => {
    const { doubles } = memory();
    doubles.fill(0, sums / 8, sums / 8 + 3 * modes);
    for (let number = 0; number * PANEL < modes; number++) {
      const reached = ranges + 8 * columns * number;
      propagatePanel(modes, columns, number * PANEL, lane, reached, upperPort, coefficients, panel);
      accumulatePanel(modes, panel, target + 8 * ROW * modes * number, sums);
    }
    let [traceRe, traceIm, power, portSum] = [0, 0, 0, 0];
    for (let row = 0; row < modes; row++) {
      const factor = factors / 8 + 4 * row + lane;
      const port = output / 8 + 4 * row + lane;
      const [a, b] = [doubles[factor]!, doubles[factor + LANES]!];
      const [c, d] = [doubles[port]!, doubles[port + LANES]!];
      const re = a * c - b * d;
      const im = a * d + b * c;
      const x = doubles[sums / 8 + 3 * row]!;
      const y = doubles[sums / 8 + 3 * row + 1]!;
      const factorPower = re * re + im * im;
      traceRe += re * x - im * y;
      traceIm += re * y + im * x;
      power += factorPower * doubles[sums / 8 + 3 * row + 2]!;
      portSum += Math.sqrt(factorPower * (x * x + y * y));
    }
    [traceRe, traceIm, power, portSum].forEach(
      (value, k) => (doubles[result / 8 + LANES * k + lane] = value),
    );
  };

  return { propagatePanel, accumulatePanel, judgeTrial };
}

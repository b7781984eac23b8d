import type { Kernels } from './loadKernels.js';
import type { TwinMemory } from './twinMemory.js';
import { LANES } from './twinMemory.js';

/** Input ports of a panel: a row of one holds two real parts, then their two imaginary parts, and so on. */
const PANEL = 8;
const ROW = 2 * PANEL;
/** Where the real parts of the ports stand in a row. */
const PLACES = Array.from({ length: PANEL }, (_, k) => k + 2 * (k >> 1));
/** From a real part to its imaginary part. */
const IMAGINARY = 2;
/** Doubles of the sums of a row: three, for even and odd inputs apart. */
const SUMS = 6;
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
    for (const k of PLACES) {
      const [a, b] = [panel[x + k]!, panel[x + k + IMAGINARY]!];
      const [c, d] = [panel[y + k]!, panel[y + k + IMAGINARY]!];
      panel[top + k] = a + (ur * c - ui * d);
      panel[top + k + IMAGINARY] = b + (ur * d + ui * c);
      panel[top + k + ROW] = c + (vr * a - vi * b);
      panel[top + k + ROW + IMAGINARY] = d + (vr * b + vi * a);
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
    for (let k = 0; k < Math.min(PANEL, modes - firstInput); k++)
      panel[(firstInput + k) * ROW + PLACES[k]!] = 1;
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
      for (const k of PLACES) {
        const at = panel / 8 + ROW * row + k;
        const [x, y] = [doubles[at]!, doubles[at + IMAGINARY]!];
        const wanted = target / 8 + ROW * row + k;
        const [c, d] = [doubles[wanted]!, doubles[wanted + IMAGINARY]!];
        const sum = sums / 8 + SUMS * row + (k % 2);
        doubles[sum]! += x * c + y * d;
        doubles[sum + 2]! += y * c - x * d;
        doubles[sum + 4]! += x * x + y * y;
      }
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
    doubles.fill(0, sums / 8, sums / 8 + SUMS * modes);
    const sumAt = (at: number): number => doubles[at]! + doubles[at + 1]!;
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
      const x = sumAt(sums / 8 + SUMS * row);
      const y = sumAt(sums / 8 + SUMS * row + 2);
      const factorPower = re * re + im * im;
      traceRe += re * x - im * y;
      traceIm += re * y + im * x;
      power += factorPower * sumAt(sums / 8 + SUMS * row + 4);
      portSum += Math.sqrt(factorPower * (x * x + y * y));
    }
    [traceRe, traceIm, power, portSum].forEach(
      (value, k) => (doubles[result / 8 + LANES * k + lane] = value),
    );
  };

  return { propagatePanel, accumulatePanel, judgeTrial };
}

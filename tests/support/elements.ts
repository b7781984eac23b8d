import type { Chip } from '../../src/chip/Chip.js';
import { listShifters } from '../../src/chip/shifters.js';
import type { ComplexMatrix } from '../../src/matrix/ComplexMatrix.js';
import { identityMatrix, zeroMatrix } from '../../src/matrix/ComplexMatrix.js';
import { multiply } from '../../src/matrix/products.js';

/** One element that the light meets: a splitter, a facet, or a shifter on one guide. */
interface Element {
  /** N x N. */
  matrix(phases: Float64Array): ComplexMatrix;
  /** The shifter (index from 0) that it is, and what its phase is multiplied by. */
  readonly shifter?: { readonly index: number; readonly factor: number; readonly port: number };
}

/** All elements of a chip as the light meets them, each written from conventions sections 2 and 3. */
function elementsOf(chip: Chip): Element[] {
  const { modes, cells, columns, upperPortIndex } = chip.mesh;
  const { loss, style } = chip;
  const elements: Element[] = [];
  const diagonal = (amplitudes: Float64Array): void => {
    const matrix = identityMatrix(modes);
    amplitudes.forEach((value, port) => (matrix.re[port * modes + port] = value));
    elements.push({ matrix: () => matrix });
  };
  const shifter = (index: number, port: number, factor = 1): void => {
    const matrix = (phases: Float64Array): ComplexMatrix => {
      const element = identityMatrix(modes);
      element.re[port * modes + port] = loss.shifter * Math.cos(factor * phases[index]!);
      element.im[port * modes + port] = loss.shifter * Math.sin(factor * phases[index]!);
      return element;
    };
    elements.push({ matrix, shifter: { index, factor, port } });
  };
  /** The splitters of a cell share its loss evenly; the cell's matrix knows their product only. */
  const splitter = (cell: number, ratio: number): void => {
    const upper = upperPortIndex[cell]!;
    const amplitude = chip.cellLoss ? chip.cellLoss[cell]! ** (1 / style.splitters) : loss.splitter;
    const matrix = identityMatrix(modes);
    const c = amplitude * Math.sqrt(1 - ratio);
    const s = amplitude * Math.sqrt(ratio);
    const at = upper * modes + upper;
    const symmetric = style.splitterForm === 'symmetric';
    matrix.re[at] = c;
    matrix.re[at + modes + 1] = symmetric ? c : -c;
    for (const cross of [at + 1, at + modes]) (symmetric ? matrix.im : matrix.re)[cross] = s;
    elements.push({ matrix: () => matrix });
  };
  const shifters = listShifters(chip);
  const portShifters = (role: string): void =>
    shifters.filter((one) => one.role === role).forEach((one) => shifter(one.index, one.portIndex));
  diagonal(loss.input);
  portShifters('input');
  for (let cell = 0; cell < cells; cell++) {
    const upper = upperPortIndex[cell]!;
    const own = shifters.filter(({ cellIndex }) => cellIndex === cell);
    const external = own.find(({ role }) => role === 'external')!;
    const internal = own.find(({ role }) => role === 'internal')!;
    const setExternal = (): void =>
      shifter(external.index, style.external.startsWith('upper') ? upper : upper + 1);
    const [ratios, outer] = innerAndOuter(chip, cell);
    if (style.external.endsWith('input')) {
      if (outer !== undefined) splitter(cell, outer);
      setExternal();
    }
    splitter(cell, ratios[0]!);
    if (style.internal === 'differential') {
      shifter(internal.index, upper, 1 / 2);
      shifter(internal.index, upper + 1, -1 / 2);
    } else shifter(internal.index, style.internal === 'upper' ? upper : upper + 1);
    splitter(cell, ratios[1]!);
    if (style.external.endsWith('output')) {
      setExternal();
      if (outer !== undefined) splitter(cell, outer);
    }
  }
  portShifters('output');
  for (let column = 0; column < columns; column++) diagonal(new Float64Array(modes).fill(loss.column));
  diagonal(loss.output);
  return elements;
}

/**
 * The ratios of a cell's two splitters around the arms, and that of its third one, which the light meets first
 * of all before an external phase at the input, last of all behind one at the output.
 */
export function innerAndOuter(
  { style, couplingRatios }: Chip,
  cell: number,
): [inner: readonly number[], outer: number | undefined] {
  const ofCell = Array.from(couplingRatios.slice(style.splitters * cell, style.splitters * (cell + 1)));
  if (style.splitters === 2) return [ofCell, undefined];
  return style.external.endsWith('input') ? [ofCell.slice(1), ofCell[0]] : [ofCell.slice(0, 2), ofCell[2]];
}

/** V and dV/dp for the phase p of every shifter, by products of N x N matrices, one per element. */
export function derivativesByElements(
  chip: Chip,
  phases: Float64Array,
): { readonly matrix: ComplexMatrix; readonly slopes: readonly ComplexMatrix[] } {
  const { modes } = chip.mesh;
  const elements = elementsOf(chip);
  const matrices = elements.map((element) => element.matrix(phases));
  const before: ComplexMatrix[] = [identityMatrix(modes)];
  matrices.forEach((matrix, k) => before.push(multiply(matrix, before[k]!)));
  let behind = identityMatrix(modes);
  const slopes = Array.from(phases, () => zeroMatrix(modes, modes));
  for (let k = elements.length - 1; k >= 0; k--) {
    const { shifter } = elements[k]!;
    if (shifter) {
      // d/dp of loss e^{i factor p} on one guide.
      const derivative = zeroMatrix(modes, modes);
      const at = shifter.port * modes + shifter.port;
      derivative.re[at] = -shifter.factor * matrices[k]!.im[at]!;
      derivative.im[at] = shifter.factor * matrices[k]!.re[at]!;
      const slope = multiply(behind, multiply(derivative, before[k]!));
      const sum = slopes[shifter.index]!;
      slope.re.forEach((value, entry) => (sum.re[entry]! += value));
      slope.im.forEach((value, entry) => (sum.im[entry]! += value));
    }
    behind = multiply(behind, matrices[k]!);
  }
  return { matrix: before.at(-1)!, slopes };
}

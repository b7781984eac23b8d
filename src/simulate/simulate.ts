import { ratiosOfCell, splitterAmplitude } from '../chip/cellSplitters.js';
import {
  applyExternalInPlace,
  applyOuterSplitterInPlace,
  writeArms,
  writeSplitArms,
} from '../chip/cellTransfer.js';
import type { Chip } from '../chip/Chip.js';
import { externalAtOutput } from '../chip/Chip.js';
import type { Settings } from '../chip/Settings.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { zeroMatrix } from '../matrix/ComplexMatrix.js';

/**
 * The transfer matrix V of a chip with the given phases, losses included: V[i][j] is the amplitude from input
 * port j to output port i. Facets, splitters, shifters and columns attenuate as conventions section 3 says; a
 * loss never changes a phase. Without loss V is unitary. Cost (28/3) N^3 flops: behind c columns light has
 * spread over 2c + 1 ports only.
 * @throws RangeError when the settings are not of the chip's shape
 */
export function simulate(chip: Chip, settings: Settings): ComplexMatrix {
  const { mesh, style, couplingRatios, loss } = chip;
  const { modes, cells, columns, upperPortIndex } = mesh;
  requireShape(chip, settings);
  const result = zeroMatrix(modes, modes);
  const portAtInput = externalAtOutput(style);
  for (let port = 0; port < modes; port++) {
    result.re[port * modes + port] = loss.input[port]!;
    if (settings.port && portAtInput) scaleRow(result, port, loss.shifter, settings.port[port]!);
  }
  const arms = new Float64Array(4);
  const transfer = new Float64Array(8);
  // The inputs whose light can be in a guide by now, as a closed interval per port.
  const firstInput = Int32Array.from({ length: modes }, (_, port) => port);
  const lastInput = firstInput.slice();
  for (let cell = 0; cell < cells; cell++) {
    writeArms(arms, style.internal, settings.internal[cell]!, loss.shifter);
    const { first: before, second: behind, outer } = ratiosOfCell(style, couplingRatios, cell);
    writeSplitArms(transfer, style.splitterForm, before, behind, arms);
    const external = settings.external[cell]!;
    applyExternalInPlace(
      transfer,
      style.external,
      loss.shifter * Math.cos(external),
      loss.shifter * Math.sin(external),
    );
    if (outer !== null) applyOuterSplitterInPlace(transfer, style, outer);
    const splitters = splitterAmplitude(chip, cell);
    for (let k = 0; k < 8; k++) transfer[k]! *= splitters;
    const upper = upperPortIndex[cell]!;
    const first = Math.min(firstInput[upper]!, firstInput[upper + 1]!);
    const last = Math.max(lastInput[upper]!, lastInput[upper + 1]!);
    firstInput[upper] = firstInput[upper + 1] = first;
    lastInput[upper] = lastInput[upper + 1] = last;
    mixRowsInPlace(result.re, result.im, upper * modes + first, modes, last - first + 1, transfer);
  }
  const allColumns = loss.column ** columns;
  for (let port = 0; port < modes; port++) {
    const phase = settings.port && !portAtInput ? settings.port[port]! : 0;
    const shifter = settings.port && !portAtInput ? loss.shifter : 1;
    scaleRow(result, port, shifter * allColumns * loss.output[port]!, phase);
  }
  return result;
}

/** Multiplies a 2x2 matrix into `count` entries of two neighbouring rows, `stride` apart. */
function mixRowsInPlace(
  re: Float64Array,
  im: Float64Array,
  start: number,
  stride: number,
  count: number,
  transfer: Float64Array,
): void {
  const ar = transfer[0]!;
  const ai = transfer[1]!;
  const br = transfer[2]!;
  const bi = transfer[3]!;
  const cr = transfer[4]!;
  const ci = transfer[5]!;
  const dr = transfer[6]!;
  const di = transfer[7]!;
  for (let x = start, y = start + stride, end = start + count; x < end; x++, y++) {
    const xr = re[x]!;
    const xi = im[x]!;
    const yr = re[y]!;
    const yi = im[y]!;
    re[x] = ar * xr - ai * xi + (br * yr - bi * yi);
    im[x] = ar * xi + ai * xr + (br * yi + bi * yr);
    re[y] = cr * xr - ci * xi + (dr * yr - di * yi);
    im[y] = cr * xi + ci * xr + (dr * yi + di * yr);
  }
}

function scaleRow({ columns, re, im }: ComplexMatrix, row: number, amplitude: number, phase: number): void {
  const c = amplitude * Math.cos(phase);
  const s = amplitude * Math.sin(phase);
  for (let k = row * columns; k < (row + 1) * columns; k++) {
    const x = re[k]!;
    re[k] = c * x - s * im[k]!;
    im[k] = c * im[k]! + s * x;
  }
}

function requireShape(chip: Chip, settings: Settings): void {
  const { cells, modes } = chip.mesh;
  const portPhases = settings.port?.length ?? 0;
  if (
    settings.internal.length !== cells ||
    settings.external.length !== cells ||
    portPhases !== (chip.portShifters ? modes : 0)
  ) {
    throw new RangeError(
      `the chip has ${cells} cells and ${chip.portShifters ? modes : 'no'} port shifters, the settings ` +
        `${settings.internal.length} internal, ${settings.external.length} external and ${portPhases} port phases`,
    );
  }
}

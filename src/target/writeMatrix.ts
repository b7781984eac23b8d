import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import type { MatrixFileKind } from './MatrixFileKind.js';

/**
 * The matrix as a file: full double precision, so that `readMatrices` gives the same bits, signed zeros
 * included. Separated text holds entries such as `0.5-0.5j`; JSON `{"matrix": [[[re, im], ...], ...]}`; .npy
 * is `<c16`, C order, format 1.0; .mtx is `matrix array complex general`. The same matrix gives the same
 * bytes.
 * @throws RangeError when an entry is not finite: no reader would take the file.
 */
export function writeMatrix(matrix: ComplexMatrix, kind: MatrixFileKind): Uint8Array {
  for (let k = 0; k < matrix.re.length; k++) {
    if (!(Number.isFinite(matrix.re[k]!) && Number.isFinite(matrix.im[k]!))) {
      throw new RangeError(`entry ${k + 1} of the matrix to write is not finite`);
    }
  }
  if (kind === 'npy') return writeNpy(matrix);
  return new TextEncoder().encode(textOf(matrix, kind));
}

const SEPARATORS = { csv: ',', tsv: '\t', txt: ' ' } as const;

function textOf(matrix: ComplexMatrix, kind: Exclude<MatrixFileKind, 'npy'>): string {
  if (kind === 'mtx') return marketText(matrix);
  if (kind === 'json') {
    const rows = rowTexts(matrix, (re, im) => `[${digits(re)}, ${digits(im)}]`, ', ');
    return `{\n  "matrix": [\n${rows.map((row) => `    [${row}]`).join(',\n')}\n  ]\n}\n`;
  }
  const entry = (re: number, im: number): string => `${digits(re)}${signOf(im)}${digits(Math.abs(im))}j`;
  return `${rowTexts(matrix, entry, SEPARATORS[kind]).join('\n')}\n`;
}

function rowTexts(
  { rows, columns, re, im }: ComplexMatrix,
  entry: (re: number, im: number) => string,
  separator: string,
): string[] {
  return Array.from({ length: rows }, (_, i) =>
    Array.from({ length: columns }, (_, j) => entry(re[i * columns + j]!, im[i * columns + j]!)).join(
      separator,
    ),
  );
}

/** Column by column, as the format wants it. */
function marketText({ rows, columns, re, im }: ComplexMatrix): string {
  const lines = ['%%MatrixMarket matrix array complex general', `${rows} ${columns}`];
  for (let j = 0; j < columns; j++) {
    for (let i = 0; i < rows; i++) {
      lines.push(`${digits(re[i * columns + j]!)} ${digits(im[i * columns + j]!)}`);
    }
  }
  return `${lines.join('\n')}\n`;
}

function writeNpy({ rows, columns, re, im }: ComplexMatrix): Uint8Array {
  const dictionary = `{'descr': '<c16', 'fortran_order': False, 'shape': (${rows}, ${columns}), }`;
  // Magic, version and length take 10 bytes; the header ends with a line feed on a multiple of 64.
  const dataStart = Math.ceil((10 + dictionary.length + 1) / 64) * 64;
  const bytes = new Uint8Array(dataStart + 16 * rows * columns);
  bytes.set([0x93, 0x4e, 0x55, 0x4d, 0x50, 0x59, 1, 0]);
  const view = new DataView(bytes.buffer);
  view.setUint16(8, dataStart - 10, true);
  bytes.set(new TextEncoder().encode(`${dictionary.padEnd(dataStart - 11)}\n`), 10);
  for (let k = 0; k < re.length; k++) {
    view.setFloat64(dataStart + 16 * k, re[k]!, true);
    view.setFloat64(dataStart + 16 * k + 8, im[k]!, true);
  }
  return bytes;
}

/** Shortest digits that read back to the same bits; -0 keeps its sign. */
function digits(value: number): string {
  return Object.is(value, -0) ? '-0' : String(value);
}

function signOf(value: number): '+' | '-' {
  return value < 0 || Object.is(value, -0) ? '-' : '+';
}

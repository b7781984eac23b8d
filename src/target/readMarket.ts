import { InputError } from '../errors/InputError.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { zeroMatrix } from '../matrix/ComplexMatrix.js';
import { cut, emptyTarget, notFinite, requireSquare } from './limits.js';

const FIELDS = ['real', 'complex', 'integer', 'pattern'] as const;
type Field = (typeof FIELDS)[number];
const SYMMETRIES = ['general', 'symmetric', 'skew-symmetric', 'hermitian'] as const;
type Symmetry = (typeof SYMMETRIES)[number];

interface Banner {
  readonly format: 'array' | 'coordinate';
  readonly field: Field;
  readonly symmetry: Symmetry;
}

/** Lines of the file with something on them, comments left out, each with its number from 1. */
interface Line {
  readonly words: readonly string[];
  readonly number: number;
}

/**
 * A matrix from the Matrix Market exchange format (Boisvert, Pozo, Remington, NISTIR 5935 (1996)): array and
 * coordinate; real, complex, integer, pattern (ones); general, symmetric, skew-symmetric, hermitian, of which
 * the lower triangle stands in the file. An entry given twice is refused, since programs differ in whether to
 * add or to replace.
 * @throws InputError `target/mtx` with the line, `target/truncated`, `target/empty`, `target/not-square`,
 * `target/too-large`, `target/not-finite`.
 */
export function readMarket(text: string, maxModes: number): ComplexMatrix {
  if (text.trim() === '') throw emptyTarget();
  const lines = filledLines(text);
  const banner = readBanner(text);
  const size = lines.next();
  if (size === undefined) throw truncated('the line with the sizes is missing');
  const counts = size.words.map((word) => wholeNumber(word, size));
  const wanted = banner.format === 'array' ? 2 : 3;
  if (counts.length !== wanted) {
    throw marketFault(`the line with the sizes has ${counts.length} numbers, not ${wanted}`, size.number);
  }
  const modes = counts[0]!;
  requireSquare(modes, counts[1]!, maxModes);
  const matrix = zeroMatrix(modes, modes);
  if (banner.format === 'array') readArray(lines, banner, matrix);
  else readCoordinates(lines, banner, matrix, counts[2]!, size.number);
  const extra = lines.next();
  if (extra !== undefined) throw marketFault('there are more entries than announced', extra.number);
  return matrix;
}

function readBanner(text: string): Banner {
  const line = text.slice(0, 200).split(/\r?\n|\r/, 1)[0]!;
  const [head, object, format, field, symmetry, ...rest] = line.trim().toLowerCase().split(/\s+/);
  if (head !== '%%matrixmarket') {
    throw marketFault('the first line does not start with %%MatrixMarket', 1);
  }
  const knownField = FIELDS.find((known) => known === field);
  const knownSymmetry = SYMMETRIES.find((known) => known === symmetry);
  if (
    object !== 'matrix' ||
    (format !== 'array' && format !== 'coordinate') ||
    knownField === undefined ||
    knownSymmetry === undefined ||
    rest.length > 0
  ) {
    throw marketFault(`"${cut(line.trim(), 80)}" is not a known kind of matrix`, 1);
  }
  if (
    (knownField === 'pattern' && (format === 'array' || knownSymmetry === 'skew-symmetric')) ||
    (knownSymmetry === 'hermitian' && knownField !== 'complex')
  ) {
    throw marketFault(`${format}, ${knownField} and ${knownSymmetry} do not go together`, 1);
  }
  return { format, field: knownField, symmetry: knownSymmetry };
}

/**
 * Column by column; of a symmetric matrix the lower triangle only, of a skew-symmetric one without the
 * diagonal.
 */
function readArray(lines: LineReader, banner: Banner, matrix: ComplexMatrix): void {
  const { rows } = matrix;
  for (let column = 0; column < rows; column++) {
    const first =
      banner.symmetry === 'general' ? 0 : banner.symmetry === 'skew-symmetric' ? column + 1 : column;
    for (let row = first; row < rows; row++) {
      const line = lines.next();
      if (line === undefined) throw truncated(`entry (${row + 1}, ${column + 1}) is missing`);
      place(
        matrix,
        row,
        column,
        numberOf(line.words, banner.field, line, row, column),
        banner.symmetry,
        line,
      );
    }
  }
}

function readCoordinates(
  lines: LineReader,
  banner: Banner,
  matrix: ComplexMatrix,
  entries: number,
  sizeLine: number,
): void {
  const { rows } = matrix;
  if (entries > rows * rows)
    throw marketFault(`${entries} entries are announced for ${rows} x ${rows}`, sizeLine);
  const seen = new Uint8Array(rows * rows);
  for (let k = 0; k < entries; k++) {
    const line = lines.next();
    if (line === undefined) throw truncated(`${k} of ${entries} entries are there`);
    const row = portIndex(line.words[0], rows, 'row', line);
    const column = portIndex(line.words[1], rows, 'column', line);
    if (banner.symmetry !== 'general' && row < column) {
      throw marketFault(
        `entry (${row + 1}, ${column + 1}) stands above the diagonal of a ${banner.symmetry} matrix`,
        line.number,
      );
    }
    if (banner.symmetry === 'skew-symmetric' && row === column) {
      throw marketFault('a skew-symmetric matrix has no entries on its diagonal', line.number);
    }
    if (seen[row * rows + column] === 1) {
      throw marketFault(`entry (${row + 1}, ${column + 1}) is given twice`, line.number);
    }
    seen[row * rows + column] = 1;
    place(
      matrix,
      row,
      column,
      numberOf(line.words.slice(2), banner.field, line, row, column),
      banner.symmetry,
      line,
    );
  }
}

function place(
  matrix: ComplexMatrix,
  row: number,
  column: number,
  [re, im]: readonly [number, number],
  symmetry: Symmetry,
  line: Line,
): void {
  const { rows } = matrix;
  matrix.re[row * rows + column] = re;
  matrix.im[row * rows + column] = im;
  if (symmetry === 'hermitian' && row === column && im !== 0) {
    throw marketFault('the diagonal of a hermitian matrix is real', line.number);
  }
  if (symmetry === 'general' || row === column) return;
  matrix.re[column * rows + row] = symmetry === 'skew-symmetric' ? -re : re;
  matrix.im[column * rows + row] = symmetry === 'symmetric' ? im : -im;
}

function numberOf(
  words: readonly string[],
  field: Field,
  line: Line,
  row: number,
  column: number,
): readonly [number, number] {
  const wanted = field === 'pattern' ? 0 : field === 'complex' ? 2 : 1;
  if (words.length !== wanted) {
    throw marketFault(`${words.length} numbers stand where a ${field} entry has ${wanted}`, line.number);
  }
  const [re = 1, im = 0] = words.map((word) => {
    if (/^[+-]?(?:nan|inf|infinity)$/i.test(word)) throw notFinite(word, row + 1, column + 1);
    const pattern = field === 'integer' ? /^[+-]?\d+$/ : /^[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?$/;
    if (!pattern.test(word))
      throw marketFault(`"${cut(word)}" is not a number of the kind ${field}`, line.number);
    const value = Number(word);
    if (!Number.isFinite(value)) throw notFinite(word, row + 1, column + 1);
    return value;
  });
  return [re, im];
}

function portIndex(word: string | undefined, modes: number, what: string, line: Line): number {
  const port = wholeNumber(word ?? '', line);
  if (!(port >= 1 && port <= modes)) {
    throw marketFault(`${what} ${port} lies outside 1 to ${modes}`, line.number);
  }
  return port - 1;
}

function wholeNumber(word: string, line: Line): number {
  if (!/^\d{1,15}$/.test(word)) throw marketFault(`"${cut(word)}" is not a whole number`, line.number);
  return Number(word);
}

interface LineReader {
  next(): Line | undefined;
}

/** The lines one by one, so that a long file is never held as an array of words. */
function filledLines(text: string): LineReader {
  const pattern = /([^\r\n]*)(\r\n|\n|\r|$)/y;
  let number = 0;
  return {
    next() {
      while (pattern.lastIndex < text.length) {
        const content = pattern.exec(text)![1]!.trim();
        number++;
        if (content !== '' && !content.startsWith('%')) return { words: content.split(/\s+/), number };
      }
      return undefined;
    },
  };
}

function marketFault(why: string, line: number): InputError {
  return new InputError(
    'target/mtx',
    `line ${line}: ${why}`,
    'Mend the line, or write the matrix anew as "matrix array complex general".',
  );
}

function truncated(why: string): InputError {
  return new InputError(
    'target/truncated',
    `the file ends too early: ${why}`,
    'Copy the whole file, or write it anew.',
  );
}

/** The kinds of file that hold a matrix: separated text, JSON, NumPy's array format, Matrix Market. */
export const MATRIX_FILE_KINDS = ['csv', 'tsv', 'txt', 'json', 'npy', 'mtx'] as const;
/** One of the kinds, which is also the file's ending without the point. */
export type MatrixFileKind = (typeof MATRIX_FILE_KINDS)[number];

/** The kind that a file name's ending stands for, in capitals or not; undefined for any other ending. */
export function matrixFileKind(name: string): MatrixFileKind | undefined {
  const ending = /\.([^./\\]+)$/.exec(name)?.[1]?.toLowerCase();
  return MATRIX_FILE_KINDS.find((kind) => kind === ending);
}

/**
 * The kind of a matrix that comes without a file name: `npy` and `mtx` by their first bytes, `json` when the
 * first character that is not blank is `[` or `{`, else `csv`.
 */
export function kindOfText(bytes: Uint8Array): MatrixFileKind {
  let at = bytes[0] === 0xef && bytes[1] === 0xbb && bytes[2] === 0xbf ? 3 : 0;
  if (startsWith(bytes, at, '\x93NUMPY')) return 'npy';
  while (at < bytes.length && BLANKS.has(bytes[at]!)) at++;
  if (startsWith(bytes, at, '%%MatrixMarket')) return 'mtx';
  return bytes[at] === 0x5b || bytes[at] === 0x7b ? 'json' : 'csv';
}

/** Space, tab, line feed, carriage return. */
const BLANKS = new Set([0x20, 0x09, 0x0a, 0x0d]);

function startsWith(bytes: Uint8Array, from: number, start: string): boolean {
  for (let k = 0; k < start.length; k++) if (bytes[from + k] !== start.charCodeAt(k)) return false;
  return true;
}

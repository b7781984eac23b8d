import { littleEndianBytes } from './doubleBytes.js';

/**
 * A table of doubles as NumPy's array format 1.0: `<f8`, C order, shape (rows, columns).
 * @throws RangeError when there are not rows x columns values
 */
export function npyTable(rows: number, columns: number, values: Float64Array): Uint8Array {
  if (values.length !== rows * columns) {
    throw new RangeError(`${values.length} values for a table of ${rows} x ${columns}`);
  }
  const header = npyHeader(rows, columns);
  const bytes = new Uint8Array(header.length + 8 * values.length);
  bytes.set(header);
  bytes.set(littleEndianBytes(values), header.length);
  return bytes;
}

/**
 * Magic, version and length take 10 bytes; the header ends with a line feed on a multiple of 64 (NumPy
 * Enhancement Proposal 1).
 */
function npyHeader(rows: number, columns: number): Uint8Array {
  const dictionary = `{'descr': '<f8', 'fortran_order': False, 'shape': (${rows}, ${columns}), }`;
  const length = Math.ceil((10 + dictionary.length + 1) / 64) * 64;
  const bytes = Buffer.alloc(length, ' ');
  bytes.set([0x93, 0x4e, 0x55, 0x4d, 0x50, 0x59, 1, 0]);
  bytes.writeUInt16LE(length - 10, 8);
  bytes.write(dictionary, 10, 'latin1');
  bytes.write('\n', length - 1, 'latin1');
  return bytes;
}

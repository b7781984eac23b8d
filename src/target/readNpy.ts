import { InputError } from '../errors/InputError.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { zeroMatrix } from '../matrix/ComplexMatrix.js';
import { emptyTarget, notFinite, requireSquare } from './limits.js';
import type { NpyHeader } from './npyHeader.js';
import { npyFault, parseNpyHeader, truncated } from './npyHeader.js';

/** Entries that a batch may hold: half a gigabyte in memory. */
const MAX_ENTRIES = 2 ** 25;

type ReadNumber = (view: DataView, at: number, little: boolean) => number;

interface ElementType {
  /** Bytes of one number; a complex entry has two of them. */
  readonly bytes: number;
  readonly complex: boolean;
  readonly read: ReadNumber;
}

const ELEMENT_TYPES: ReadonlyMap<string, ElementType> = new Map([
  ['f2', realType(2, (view, at, little) => halfPrecision(view.getUint16(at, little)))],
  ['f4', realType(4, (view, at, little) => view.getFloat32(at, little))],
  ['f8', realType(8, (view, at, little) => view.getFloat64(at, little))],
  ['c8', { ...realType(4, (view, at, little) => view.getFloat32(at, little)), complex: true }],
  ['c16', { ...realType(8, (view, at, little) => view.getFloat64(at, little)), complex: true }],
  ['b1', realType(1, (view, at) => (view.getUint8(at) === 0 ? 0 : 1))],
  ['i1', realType(1, (view, at) => view.getInt8(at))],
  ['i2', realType(2, (view, at, little) => view.getInt16(at, little))],
  ['i4', realType(4, (view, at, little) => view.getInt32(at, little))],
  ['i8', realType(8, (view, at, little) => Number(view.getBigInt64(at, little)))],
  ['u1', realType(1, (view, at) => view.getUint8(at))],
  ['u2', realType(2, (view, at, little) => view.getUint16(at, little))],
  ['u4', realType(4, (view, at, little) => view.getUint32(at, little))],
  ['u8', realType(8, (view, at, little) => Number(view.getBigUint64(at, little)))],
]);

/**
 * Matrices from NumPy's .npy format: one from shape (N, N), K of them from shape (K, N, N). Types f2, f4, f8,
 * c8, c16, b1, i1 to i8, u1 to u8, either byte order, C or Fortran order. 64-bit integers beyond 2^53 are
 * rounded.
 * @throws InputError `target/npy`, `target/npy-object`, `target/truncated`, `target/empty`,
 * `target/not-square`, `target/too-large`, `target/not-finite`.
 */
export function readNpy(bytes: Uint8Array, maxModes: number): ComplexMatrix[] {
  const header = parseNpyHeader(bytes);
  const { type, little } = elementType(header.descr);
  const { count, modes } = shapeOf(header, maxModes);
  const entryBytes = type.bytes * (type.complex ? 2 : 1);
  const wanted = count * modes * modes * entryBytes;
  const present = bytes.length - header.dataStart;
  if (present < wanted) throw truncated(`the entries: ${present} bytes of ${wanted} are there`);
  if (present > wanted)
    throw npyFault(`${present - wanted} bytes follow the entries that its shape announces`);
  const view = new DataView(bytes.buffer, bytes.byteOffset + header.dataStart, wanted);
  return Array.from({ length: count }, (_, batch) => {
    const matrix = zeroMatrix(modes, modes);
    for (let row = 0; row < modes; row++) {
      for (let column = 0; column < modes; column++) {
        // Fortran order: the first index runs fastest, so the batch does.
        const entry = header.fortranOrder
          ? batch + count * (row + modes * column)
          : (batch * modes + row) * modes + column;
        const at = entry * entryBytes;
        const re = type.read(view, at, little);
        const im = type.complex ? type.read(view, at + type.bytes, little) : 0;
        if (!(Number.isFinite(re) && Number.isFinite(im))) {
          throw notFinite(
            `${type.complex ? `(${re}, ${im})` : re}${count > 1 ? ` in matrix ${batch + 1}` : ''}`,
            row + 1,
            column + 1,
          );
        }
        matrix.re[row * modes + column] = re;
        matrix.im[row * modes + column] = im;
      }
    }
    return matrix;
  });
}

function shapeOf({ shape }: NpyHeader, maxModes: number): { count: number; modes: number } {
  if (shape.length !== 2 && shape.length !== 3) {
    throw new InputError(
      'target/not-square',
      `the array has shape (${shape.slice(0, 8).join(', ')}${shape.length === 1 ? ',' : ''})`,
      'Give one square matrix of shape (N, N), or K of them of shape (K, N, N).',
    );
  }
  const count = shape.length === 3 ? shape[0]! : 1;
  if (count === 0) throw emptyTarget();
  const modes = shape.at(-1)!;
  requireSquare(shape.at(-2)!, modes, maxModes);
  if (count * modes * modes > MAX_ENTRIES) {
    throw new InputError(
      'target/too-large',
      `the array holds ${count} matrices of ${modes} x ${modes}, over ${MAX_ENTRIES} entries`,
      'Split it into several files.',
    );
  }
  return { count, modes };
}

function elementType(descr: string): { type: ElementType; little: boolean } {
  if (/^[|<>=]?O/.test(descr)) {
    throw npyFault('it holds Python objects (pickled), which are never loaded', 'target/npy-object');
  }
  const type = ELEMENT_TYPES.get(descr.slice(1));
  const order = descr[0];
  const ordered = order === '<' || order === '>' || (order === '|' && type?.bytes === 1);
  if (type === undefined || !ordered) {
    throw npyFault(`its entries have the type "${descr.slice(0, 40)}", which is not read here`);
  }
  return { type, little: order !== '>' };
}

function realType(bytes: number, read: ReadNumber): ElementType {
  return { bytes, complex: false, read };
}

/** IEEE 754 binary16. */
function halfPrecision(bits: number): number {
  const sign = bits & 0x8000 ? -1 : 1;
  const exponent = (bits >> 10) & 0x1f;
  const fraction = bits & 0x3ff;
  if (exponent === 0x1f) return fraction === 0 ? sign * Infinity : NaN;
  return exponent === 0 ? sign * fraction * 2 ** -24 : sign * (1 + fraction / 1024) * 2 ** (exponent - 15);
}

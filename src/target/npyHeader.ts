import { InputError } from '../errors/InputError.js';

/** What the header of an .npy file says. */
export interface NpyHeader {
  /** Type string of NumPy's array protocol, such as `<c16`. */
  readonly descr: string;
  readonly fortranOrder: boolean;
  readonly shape: readonly number[];
  /** Index of the first byte behind the header. */
  readonly dataStart: number;
}

/** NumPy itself distrusts headers beyond 10 000 characters. */
const MAX_HEADER = 65_536;
const MAGIC = [0x93, 0x4e, 0x55, 0x4d, 0x50, 0x59];

/**
 * Header of NumPy's array format, versions 1.0, 2.0 and 3.0 (NumPy Enhancement Proposal 1 and
 * numpy.lib.format). The dictionary is read by a strict parser of its own for the three keys that may stand
 * there.
 * @throws InputError `target/npy`, `target/truncated`, `target/empty`, or `target/npy-object` for arrays of
 * Python objects.
 */
export function parseNpyHeader(bytes: Uint8Array): NpyHeader {
  if (bytes.length === 0) throw npyFault('it is empty', 'target/empty');
  if (MAGIC.some((byte, k) => k < bytes.length && bytes[k] !== byte)) {
    throw npyFault('its first bytes are not those of a NumPy array');
  }
  const major = bytes[6];
  const lengthBytes = major === 1 ? 2 : 4;
  if (major === undefined || bytes.length < 8 + lengthBytes) throw truncated('its header');
  if (major > 3 || major === 0) throw npyFault(`it has format version ${major}, and 1, 2 and 3 are known`);
  const view = new DataView(bytes.buffer, bytes.byteOffset, bytes.byteLength);
  const length = lengthBytes === 2 ? view.getUint16(8, true) : view.getUint32(8, true);
  const dataStart = 8 + lengthBytes + length;
  if (length > MAX_HEADER) throw npyFault(`its header is ${length} bytes long`);
  if (dataStart > bytes.length) throw truncated('its header');
  const text = Array.from(bytes.subarray(8 + lengthBytes, dataStart), (byte) =>
    String.fromCharCode(byte),
  ).join('');
  return { ...new DictionaryReader(text).read(), dataStart };
}

/**
 * Reads `{'descr': '<c16', 'fortran_order': False, 'shape': (4, 4), }`, keys in any order, each exactly once.
 */
class DictionaryReader {
  private at = 0;

  constructor(private readonly text: string) {}

  read(): Omit<NpyHeader, 'dataStart'> {
    let descr: string | undefined;
    let fortranOrder: boolean | undefined;
    let shape: number[] | undefined;
    this.expect('{');
    while (!this.take('}')) {
      const key = this.string();
      this.expect(':');
      if (key === 'descr' && descr === undefined) descr = this.descr();
      else if (key === 'fortran_order' && fortranOrder === undefined) fortranOrder = this.boolean();
      else if (key === 'shape' && shape === undefined) shape = this.shape();
      else throw npyFault(`its header has the key "${key.slice(0, 40)}" in a place where it does not belong`);
      if (!this.take(',')) {
        this.expect('}');
        break;
      }
    }
    if (this.text.slice(this.at).trim() !== '') throw npyFault('its header goes on behind the dictionary');
    if (descr === undefined || fortranOrder === undefined || shape === undefined) {
      throw npyFault('its header lacks descr, fortran_order or shape');
    }
    return { descr, fortranOrder, shape };
  }

  private descr(): string {
    if (this.take('[')) throw npyFault('it holds records (a structured type), not numbers');
    return this.string();
  }

  private string(): string {
    const found = this.match(/'([^'\\]*)'|"([^"\\]*)"/y);
    return found[1] ?? found[2]!;
  }

  private boolean(): boolean {
    return this.match(/True|False/y)[0] === 'True';
  }

  private shape(): number[] {
    const inside = this.match(/\(([\d\s,L]*)\)/y)[1]!.trim();
    if (inside === '') return [];
    const parts = inside.replace(/,$/, '').split(',');
    return parts.map((part) => {
      const digits = /^\s*(\d{1,15})L?\s*$/.exec(part)?.[1];
      if (digits === undefined)
        throw npyFault(`its shape (${inside.slice(0, 40)}) is not a list of whole numbers`);
      return Number(digits);
    });
  }

  private expect(sign: string): void {
    if (!this.take(sign)) throw npyFault(`its header lacks a "${sign}" at character ${this.at + 1}`);
  }

  private take(sign: string): boolean {
    this.skipBlanks();
    if (this.text[this.at] !== sign) return false;
    this.at++;
    return true;
  }

  private match(pattern: RegExp): RegExpExecArray {
    this.skipBlanks();
    pattern.lastIndex = this.at;
    const found = pattern.exec(this.text);
    if (found === null) throw npyFault(`its header cannot be read from character ${this.at + 1} on`);
    this.at += found[0].length;
    return found;
  }

  private skipBlanks(): void {
    while (/\s/.test(this.text[this.at] ?? '')) this.at++;
  }
}

/** The fault of a file that is not an array of numbers as NumPy writes it. */
export function npyFault(why: string, code = 'target/npy'): InputError {
  return new InputError(
    code,
    `this .npy file cannot be read: ${why}`,
    'Write it anew with numpy.save(name, matrix.astype(complex)).',
  );
}

/** The fault of a file that ends too early. */
export function truncated(what: string): InputError {
  return npyFault(`the file ends within ${what}`, 'target/truncated');
}

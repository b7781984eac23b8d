import { decodeText } from '../errors/decodeText.js';
import { InputError } from '../errors/InputError.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import type { ReadLimits } from './limits.js';
import { emptyTarget, maxModesOf } from './limits.js';
import type { MatrixFileKind } from './MatrixFileKind.js';
import { readDelimited } from './readDelimited.js';
import { readJson } from './readJson.js';
import { readMarket } from './readMarket.js';
import { readNpy } from './readNpy.js';

/**
 * The square matrices in a file: one, or K of them from an .npy file of shape (K, N, N). Every entry is
 * finite. The bytes are not changed, and the result shares nothing with them.
 * @throws InputError, with row and column where they are known; the caller adds the file's name with
 * `withSource`.
 */
export function readMatrices(bytes: Uint8Array, kind: MatrixFileKind, limits?: ReadLimits): ComplexMatrix[] {
  const maxModes = maxModesOf(limits);
  if (bytes.length === 0) throw emptyTarget();
  if (kind === 'npy') return readNpy(bytes, maxModes);
  refuseOverlong(bytes, maxModes);
  const text = decodeText(bytes);
  if (kind === 'json') return [readJson(text, maxModes)];
  if (kind === 'mtx') return [readMarket(text, maxModes)];
  return [readDelimited(text, maxModes)];
}

/**
 * No sensible entry takes 300 bytes: a longer text cannot hold a matrix within the limit, and is not worth
 * parsing.
 */
function refuseOverlong(bytes: Uint8Array, maxModes: number): void {
  if (bytes.length <= 1e6 + 300 * maxModes ** 2) return;
  throw new InputError(
    'target/too-large',
    `the text is ${Math.round(bytes.length / 1e6)} MB long, too much for ${maxModes} x ${maxModes} entries`,
    'Give a smaller target.',
  );
}

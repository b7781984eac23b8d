import { readFileSync } from 'node:fs';
import { expect } from 'vitest';
import { InputError } from '../../src/errors/InputError.js';
import type { ComplexMatrix } from '../../src/matrix/ComplexMatrix.js';
import { readMatrices } from '../../src/target/readMatrices.js';
import type { MatrixFileKind } from '../../src/target/MatrixFileKind.js';

const FOLDER = new URL('../fixtures/target/', import.meta.url);

export function fixture(name: string): Uint8Array {
  return new Uint8Array(readFileSync(new URL(name, FOLDER)));
}

/** The matrices that the script in tests/fixtures/target/README.md wrote, by file name. */
export const EXPECTED = JSON.parse(new TextDecoder().decode(fixture('expected.json'))) as Record<
  string,
  [re: number, im: number][][][]
>;

export function bytesOf(text: string): Uint8Array {
  return new TextEncoder().encode(text);
}

/** One matrix from text, as rows of [re, im]. */
export function rowsFrom(text: string, kind: MatrixFileKind): [number, number][][] {
  const matrices = readMatrices(bytesOf(text), kind);
  expect(matrices).toHaveLength(1);
  return rowsOf(matrices[0]!);
}

export function rowsOf({ rows, columns, re, im }: ComplexMatrix): [number, number][][] {
  return Array.from({ length: rows }, (_, i) =>
    Array.from({ length: columns }, (_, j): [number, number] => [re[i * columns + j]!, im[i * columns + j]!]),
  );
}

/** Largest |difference| of two matrices of one shape. */
export function distance(left: ComplexMatrix, right: ComplexMatrix): number {
  expect([left.rows, left.columns]).toEqual([right.rows, right.columns]);
  let largest = 0;
  for (let k = 0; k < left.re.length; k++) {
    largest = Math.max(largest, Math.hypot(left.re[k]! - right.re[k]!, left.im[k]! - right.im[k]!));
  }
  return largest;
}

/** The InputError that the call throws, checked to have this code, one line of fault and one of remedy. */
export function faultOf(call: () => unknown, code: string): InputError {
  let caught: unknown;
  try {
    call();
  } catch (error) {
    caught = error;
  }
  return requireFault(caught, code);
}

export async function faultOfPromise(promise: Promise<unknown>, code: string): Promise<InputError> {
  const caught = await promise.then(
    () => undefined,
    (error: unknown) => error,
  );
  return requireFault(caught, code);
}

function requireFault(caught: unknown, code: string): InputError {
  if (!(caught instanceof InputError))
    throw new Error(`no InputError ${code}, but ${String(caught)}`, { cause: caught });
  expect(`${caught.code}: ${caught.message}`).toMatch(new RegExp(`^${code}: `));
  expect(caught.message).toMatch(/^.{1,400}$/);
  expect(caught.remedy).toMatch(/^.{5,200}$/);
  return caught;
}

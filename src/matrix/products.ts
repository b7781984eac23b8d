import type { ComplexMatrix } from './ComplexMatrix.js';
import { zeroMatrix } from './ComplexMatrix.js';

/** Conjugate transpose. */
export function adjoint(matrix: ComplexMatrix): ComplexMatrix {
  const result = transpose(matrix);
  for (let k = 0; k < result.im.length; k++) result.im[k] = -result.im[k]!;
  return result;
}

/** Transpose without conjugation. */
export function transpose({ rows, columns, re, im }: ComplexMatrix): ComplexMatrix {
  const result = zeroMatrix(columns, rows);
  for (let i = 0; i < rows; i++) {
    for (let j = 0; j < columns; j++) {
      result.re[j * rows + i] = re[i * columns + j]!;
      result.im[j * rows + i] = im[i * columns + j]!;
    }
  }
  return result;
}

/** Complex conjugate, entry by entry. */
export function conjugate(matrix: ComplexMatrix): ComplexMatrix {
  return { ...matrix, re: matrix.re.slice(), im: matrix.im.map((value) => -value) };
}

/** Ports in reverse order at both ends: J U J with J the exchange of the first and last port, and so on. */
export function reversePorts({ rows, columns, re, im }: ComplexMatrix): ComplexMatrix {
  return { rows, columns, re: re.slice().reverse(), im: im.slice().reverse() };
}

/** left times right. Cost rows * inner * columns. @throws RangeError when the shapes do not match. */
export function multiply(left: ComplexMatrix, right: ComplexMatrix): ComplexMatrix {
  if (left.columns !== right.rows) {
    throw new RangeError(
      `cannot multiply ${left.rows} x ${left.columns} by ${right.rows} x ${right.columns}`,
    );
  }
  const { rows, columns: inner } = left;
  const { columns } = right;
  const product = zeroMatrix(rows, columns);
  const { re, im } = product;
  for (let i = 0; i < rows; i++) {
    const to = i * columns;
    for (let k = 0; k < inner; k++) {
      const ar = left.re[i * inner + k]!;
      const ai = left.im[i * inner + k]!;
      const from = k * columns;
      for (let j = 0; j < columns; j++) {
        const br = right.re[from + j]!;
        const bi = right.im[from + j]!;
        re[to + j]! += ar * br - ai * bi;
        im[to + j]! += ar * bi + ai * br;
      }
    }
  }
  return product;
}

/** left - right, entry by entry. */
export function subtract(left: ComplexMatrix, right: ComplexMatrix): ComplexMatrix {
  requireSameShape(left, right);
  return {
    ...left,
    re: left.re.map((value, k) => value - right.re[k]!),
    im: left.im.map((value, k) => value - right.im[k]!),
  };
}

/** The matrix times e^{i angle}. */
export function turnPhase(matrix: ComplexMatrix, angle: number): ComplexMatrix {
  const c = Math.cos(angle);
  const s = Math.sin(angle);
  return {
    ...matrix,
    re: matrix.re.map((value, k) => c * value - s * matrix.im[k]!),
    im: matrix.im.map((value, k) => c * value + s * matrix.re[k]!),
  };
}

/** Tr(left^dagger right) as [re, im]: the inner product of Hilbert and Schmidt. */
export function innerProduct(left: ComplexMatrix, right: ComplexMatrix): [re: number, im: number] {
  requireSameShape(left, right);
  let re = 0;
  let im = 0;
  for (let k = 0; k < left.re.length; k++) {
    re += left.re[k]! * right.re[k]! + left.im[k]! * right.im[k]!;
    im += left.re[k]! * right.im[k]! - left.im[k]! * right.re[k]!;
  }
  return [re, im];
}

function requireSameShape(left: ComplexMatrix, right: ComplexMatrix): void {
  if (left.rows !== right.rows || left.columns !== right.columns) {
    throw new RangeError(
      `shapes differ: ${left.rows} x ${left.columns} and ${right.rows} x ${right.columns}`,
    );
  }
}

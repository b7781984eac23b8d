import type { ComplexMatrix, Entry } from '../../src/matrix/ComplexMatrix.js';
import { identityMatrix, matrixFromRows, zeroMatrix } from '../../src/matrix/ComplexMatrix.js';
import { haarUnitary } from '../../src/matrix/haar.js';

/** Largest |difference| of entries; NaN when one is NaN. */
export function maxDifference(a: ComplexMatrix, b: ComplexMatrix): number {
  if (a.rows !== b.rows || a.columns !== b.columns) return Infinity;
  return a.re.reduce(
    (largest, value, k) => Math.max(largest, Math.hypot(value - b.re[k]!, a.im[k]! - b.im[k]!)),
    0,
  );
}

/** U_jk = e^{+2 pi i jk/N}/sqrt(N). */
export function dft(modes: number): ComplexMatrix {
  const matrix = zeroMatrix(modes, modes);
  for (let j = 0; j < modes; j++) {
    for (let k = 0; k < modes; k++) {
      const angle = (2 * Math.PI * ((j * k) % modes)) / modes;
      matrix.re[j * modes + k] = Math.cos(angle) / Math.sqrt(modes);
      matrix.im[j * modes + k] = Math.sin(angle) / Math.sqrt(modes);
    }
  }
  return matrix;
}

/** Light entering port j (from 0) leaves at places[j]. */
export function permutation(places: readonly number[]): ComplexMatrix {
  const modes = places.length;
  const matrix = zeroMatrix(modes, modes);
  places.forEach((place, j) => (matrix.re[place * modes + j] = 1));
  return matrix;
}

export function reversal(modes: number): ComplexMatrix {
  return permutation(Array.from({ length: modes }, (_, j) => modes - 1 - j));
}

/** All orders of 0..n-1. */
export function allPermutations(n: number): number[][] {
  if (n === 0) return [[]];
  return allPermutations(n - 1).flatMap((rest) =>
    Array.from({ length: n }, (_, at) => [...rest.slice(0, at), n - 1, ...rest.slice(at)]),
  );
}

/** Blocks down the diagonal. */
export function blockDiagonal(...blocks: readonly ComplexMatrix[]): ComplexMatrix {
  const modes = blocks.reduce((sum, block) => sum + block.rows, 0);
  const matrix = zeroMatrix(modes, modes);
  let at = 0;
  for (const block of blocks) {
    for (let i = 0; i < block.rows; i++) {
      for (let j = 0; j < block.rows; j++) {
        matrix.re[(at + i) * modes + at + j] = block.re[i * block.rows + j]!;
        matrix.im[(at + i) * modes + at + j] = block.im[i * block.rows + j]!;
      }
    }
    at += block.rows;
  }
  return matrix;
}

/** Real Hadamard matrix of 2^k ports, normalised. */
export function hadamard(modes: number): ComplexMatrix {
  const bits = (n: number): number => (n === 0 ? 0 : (n & 1) + bits(n >> 1));
  return matrixFromRows(
    Array.from({ length: modes }, (_, i) =>
      Array.from({ length: modes }, (_, j) => (bits(i & j) % 2 === 0 ? 1 : -1) / Math.sqrt(modes)),
    ),
  );
}

/** A real orthogonal matrix: Householder reflection at a fixed vector. */
export function reflection(modes: number): ComplexMatrix {
  const v = Array.from({ length: modes }, (_, k) => Math.sin(1 + 3 * k));
  const square = v.reduce((sum, x) => sum + x * x, 0);
  return matrixFromRows(v.map((x, i) => v.map((y, j) => (i === j ? 1 : 0) - (2 * x * y) / square)));
}

/** The same matrix with rounding noise of 1e-17 where it has zeros. */
export function withNoise(matrix: ComplexMatrix): ComplexMatrix {
  const noise = (k: number): number => 1e-17 * Math.sin(12.9898 * (k + 1));
  return {
    ...matrix,
    re: matrix.re.map((value, k) => (value === 0 ? noise(k) : value)),
    im: matrix.im.map((value, k) => (value === 0 ? noise(k + 0.5) : value)),
  };
}

/** Nearly the identity: rotations by angles of about 1e-9 between neighbours. */
export function nearIdentity(modes: number): ComplexMatrix {
  const { re, im, ...shape } = identityMatrix(modes);
  for (let i = 0; i + 1 < modes; i++) {
    const angle = 1e-9 * Math.sin(i * i + 1);
    for (let k = 0; k < modes; k++) {
      const x = re[i * modes + k]!;
      const y = re[(i + 1) * modes + k]!;
      re[i * modes + k] = Math.cos(angle) * x - Math.sin(angle) * y;
      re[(i + 1) * modes + k] = Math.sin(angle) * x + Math.cos(angle) * y;
    }
  }
  return { ...shape, re, im };
}

/** Random and hard unitary matrices of a size, by name. */
export function unitaryMatrices(modes: number): [name: string, matrix: ComplexMatrix][] {
  const half = Math.max(1, modes >> 1);
  const matrices: [string, ComplexMatrix][] = [
    ['Haar', haarUnitary(modes, 11)],
    ['Fourier', dft(modes)],
    ['identity', identityMatrix(modes)],
    ['reversal', reversal(modes)],
    ['cyclic shift', permutation(Array.from({ length: modes }, (_, j) => (j + 1) % modes))],
    ['reflection', reflection(modes)],
    ['nearly the identity', nearIdentity(modes)],
    ['reversal with noise', withNoise(reversal(modes))],
  ];
  if (modes >= 2)
    matrices.push(['blocks', blockDiagonal(haarUnitary(half, 5), haarUnitary(modes - half, 6))]);
  return matrices;
}

/**
 * The nonlinear-sign gate of Knill, Laflamme, Milburn, Nature 409, 46 (2001); entries from memory, unitarity
 * checked.
 */
export function nonlinearSignGate(): ComplexMatrix {
  const a = 2 ** -0.25;
  const b = Math.sqrt(3 / Math.SQRT2 - 2);
  const c = 1 / 2 - Math.SQRT1_2;
  const rows: Entry[][] = [
    [1 - Math.SQRT2, a, b],
    [a, 1 / 2, c],
    [b, c, Math.SQRT2 - 1 / 2],
  ];
  return matrixFromRows(rows);
}

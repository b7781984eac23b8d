import { describe, expect, it } from 'vitest';
import { identityMatrix, matrixFromRows, zeroMatrix } from '../../src/matrix/ComplexMatrix.js';
import {
  adjoint,
  conjugate,
  innerProduct,
  multiply,
  reversePorts,
  subtract,
  transpose,
  turnPhase,
} from '../../src/matrix/products.js';
import { largestDifference, normalMatrix, realEmbedding } from './support.js';

const A = matrixFromRows([
  [
    [1, 2],
    [0, -1],
  ],
  [3, [2, 2]],
]);
const B = matrixFromRows([
  [
    [0, 1],
    [1, 1],
  ],
  [[2, -1], 4],
]);

describe('multiply', () => {
  it('gives a product worked out by hand', () => {
    // (1+2i)i + (-i)(2-i) = -3 - i;  (1+2i)(1+i) - 4i = -1 - i;  3i + (2+2i)(2-i) = 6 + 5i;  3(1+i) +
    // 4(2+2i) = 11 + 11i
    const product = matrixFromRows([
      [
        [-3, -1],
        [-1, -1],
      ],
      [
        [6, 5],
        [11, 11],
      ],
    ]);
    expect(multiply(A, B)).toEqual(product);
  });

  it.each([
    [1, 1, 1],
    [3, 5, 2],
    [2, 1, 6],
    [17, 17, 17],
  ])('agrees with the real embedding for %i x %i times %i columns', (rows, inner, columns) => {
    const left = normalMatrix(rows, inner, 1);
    const right = normalMatrix(inner, columns, 2);
    const real = realEmbedding(left).mmul(realEmbedding(right));
    const ours = realEmbedding(multiply(left, right));
    expect(real.sub(ours).abs().max()).toBeLessThan(inner * 20 * Number.EPSILON);
  });

  it('refuses shapes that do not match', () => {
    expect(() => multiply(zeroMatrix(2, 3), zeroMatrix(2, 3))).toThrow(
      new RangeError('cannot multiply 2 x 3 by 2 x 3'),
    );
  });

  it('lets a NaN through, even against a zero', () => {
    const bad = matrixFromRows([[NaN, 1]]);
    expect(multiply(matrixFromRows([[0]]), bad).re[0]).toBeNaN();
  });
});

describe('transpose, adjoint, conjugate', () => {
  it('exchange rows and columns, conjugate, or both', () => {
    const wide = matrixFromRows([[[1, 2], 3, [0, -5]]]);
    expect(transpose(wide)).toEqual(matrixFromRows([[[1, 2]], [3], [[0, -5]]]));
    expect(largestDifference(adjoint(wide), matrixFromRows([[[1, -2]], [3], [[0, 5]]]))).toBe(0);
    expect(largestDifference(conjugate(wide), matrixFromRows([[[1, -2], 3, [0, 5]]]))).toBe(0);
  });

  it('reverse products', () => {
    const left = normalMatrix(4, 3, 3);
    const right = normalMatrix(3, 5, 4);
    const product = multiply(left, right);
    const few = 100 * Number.EPSILON;
    expect(largestDifference(adjoint(product), multiply(adjoint(right), adjoint(left)))).toBeLessThan(few);
    expect(largestDifference(transpose(product), multiply(transpose(right), transpose(left)))).toBeLessThan(
      few,
    );
    expect(largestDifference(conjugate(product), multiply(conjugate(left), conjugate(right)))).toBe(0);
  });
});

describe('reversePorts', () => {
  it.each([1, 2, 5])('is J U J on %i ports', (modes) => {
    const exchange = zeroMatrix(modes, modes);
    for (let i = 0; i < modes; i++) exchange.re[i * modes + modes - 1 - i] = 1;
    const matrix = normalMatrix(modes, modes, 5);
    const expected = multiply(exchange, multiply(matrix, exchange));
    expect(largestDifference(reversePorts(matrix), expected)).toBe(0);
  });
});

describe('subtract', () => {
  it('works entry by entry and refuses other shapes', () => {
    const expected = matrixFromRows([
      [
        [1, 1],
        [-1, -2],
      ],
      [
        [1, 1],
        [-2, 2],
      ],
    ]);
    expect(subtract(A, B)).toEqual(expected);
    expect(() => subtract(A, zeroMatrix(2, 3))).toThrow(new RangeError('shapes differ: 2 x 2 and 2 x 3'));
  });
});

describe('turnPhase', () => {
  it('multiplies by e^{i angle}', () => {
    const quarter = matrixFromRows([
      [
        [-2, 1],
        [1, 0],
      ],
      [
        [0, 3],
        [-2, 2],
      ],
    ]);
    expect(largestDifference(turnPhase(A, Math.PI / 2), quarter)).toBeLessThan(4 * Number.EPSILON);
    expect(largestDifference(turnPhase(turnPhase(A, 1.3), -1.3), A)).toBeLessThan(4 * Number.EPSILON);
  });
});

describe('innerProduct', () => {
  it('is the trace of left^dagger right', () => {
    const left = normalMatrix(3, 4, 6);
    const right = normalMatrix(3, 4, 7);
    const product = multiply(adjoint(left), right);
    const trace = [0, 1, 2, 3].reduce(
      ([re, im], k) => [re + product.re[5 * k]!, im + product.im[5 * k]!] as const,
      [0, 0] as readonly [number, number],
    );
    const [re, im] = innerProduct(left, right);
    expect(Math.hypot(re - trace[0], im - trace[1])).toBeLessThan(100 * Number.EPSILON);
    expect(innerProduct(matrixFromRows([[[0, 1]]]), matrixFromRows([[1]]))).toEqual([0, -1]);
    expect(() => innerProduct(left, identityMatrix(3))).toThrow(RangeError);
  });
});

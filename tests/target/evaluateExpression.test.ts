import vm from 'node:vm';
import { describe, expect, it } from 'vitest';
import type { ComplexMatrix } from '../../src/matrix/ComplexMatrix.js';
import { identityMatrix, matrixFromRows, zeroMatrix } from '../../src/matrix/ComplexMatrix.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import { unitarityDefect } from '../../src/matrix/norms.js';
import { adjoint, conjugate, multiply, transpose } from '../../src/matrix/products.js';
import { evaluateExpression } from '../../src/target/evaluateExpression.js';
import { distance, faultOfPromise } from './support.js';

/** A few roundings of numbers of size 1. */
const ROUNDING = 2e-15;

async function expectMatrix(text: string, expected: ComplexMatrix, within = ROUNDING): Promise<void> {
  expect(distance(await evaluateExpression(text), expected), text).toBeLessThan(within);
}

function matrixOf(modes: number, entry: (row: number, column: number) => [number, number]): ComplexMatrix {
  const matrix = zeroMatrix(modes, modes);
  for (let k = 0; k < modes ** 2; k++) [matrix.re[k], matrix.im[k]] = entry(Math.floor(k / modes), k % modes);
  return matrix;
}

/** conventions: U_jk = e^{+2 pi i jk/N}/sqrt(N), j and k from 0. */
function fourier(modes: number): ComplexMatrix {
  return matrixOf(modes, (j, k) => {
    const angle = (2 * Math.PI * ((j * k) % modes)) / modes;
    return [Math.cos(angle) / Math.sqrt(modes), Math.sin(angle) / Math.sqrt(modes)];
  });
}

const EXCHANGE = matrixFromRows([
  [0, 1],
  [1, 0],
]);

describe('our functions', () => {
  it('dft has the positive exponent and exact quarter turns', async () => {
    for (const modes of [1, 2, 3, 4, 5, 8, 12]) await expectMatrix(`dft(${modes})`, fourier(modes));
    const four = await evaluateExpression('dft(4)');
    expect([...four.re.slice(4, 8), ...four.im.slice(4, 8)]).toEqual([0.5, 0, -0.5, 0, 0, 0.5, 0, -0.5]);
    expect(four.im[5]).toBe(0.5);
    expect(unitarityDefect(await evaluateExpression('dft(100)'))).toBeLessThan(1e-14);
  });

  it('dft shifts: it turns a cyclic permutation into phases e^{2 pi i k/N}', async () => {
    const shift = await evaluateExpression('permutation([2,3,1])');
    const transform = await evaluateExpression('dft(3)');
    const turned = multiply(multiply(transform, shift), adjoint(transform));
    await expectMatrix('diag([1, cis(2*pi/3), cis(4*pi/3)])', turned);
  });

  it('haar is the matrix of the seed', async () => {
    expect(await evaluateExpression('haar(5, 3)')).toEqual(haarUnitary(5, 3));
    expect(await evaluateExpression(' haar ( 5 , 3 ) ')).toEqual(haarUnitary(5, 3));
    const fault = await faultOfPromise(evaluateExpression('haar(5)'), 'target/haar-seed');
    expect(fault.remedy).toMatch(/haar\(4, 1\)/);
    await faultOfPromise(evaluateExpression('haar(1+1)'), 'target/haar-seed');
    await faultOfPromise(evaluateExpression('haar(2)*dft(2)'), 'target/haar-seed');
  });

  it('hadamard is symmetric, real, unitary, and Sylvester of twice the size is [H H; H -H]/sqrt(2)', async () => {
    await expectMatrix('hadamard(8)', await evaluateExpression('kron([1,1;1,-1]/sqrt(2), hadamard(4))'));
    await expectMatrix('hadamard(1)', identityMatrix(1));
    expect(unitarityDefect(await evaluateExpression('hadamard(64)'))).toBeLessThan(ROUNDING);
  });

  it('permutation([2,3,1]): light entering port 1 leaves at 2, 2 at 3, 3 at 1', async () => {
    const { re } = await evaluateExpression('permutation([2,3,1])');
    expect([...re]).toEqual([0, 0, 1, 1, 0, 0, 0, 1, 0]);
  });

  it('splitter has the symmetric form with k the power that crosses', async () => {
    const a = Math.asin(Math.sqrt(0.3));
    const expected = matrixFromRows([
      [Math.cos(a), [0, Math.sin(a)]],
      [[0, Math.sin(a)], Math.cos(a)],
    ]);
    await expectMatrix('splitter(0.3)', expected);
    await expectMatrix('splitter(3/10)', expected);
    await expectMatrix('splitter(0)', identityMatrix(2));
    // Two halves make a cross, up to i: conventions, section 3, theta = 0.
    await expectMatrix('splitter(0.5)^2/i', EXCHANGE);
  });

  it('direct is block diagonal from the top, also nested and with numbers', async () => {
    const nested = await evaluateExpression('direct(dft(2), direct(-i, permutation([2,1])), haar(3, 7))');
    expect(nested.rows).toBe(8);
    expect([nested.im[2 * 8 + 2], nested.re[3 * 8 + 4], nested.re[4 * 8 + 3]]).toEqual([-1, 1, 1]);
    const last = haarUnitary(3, 7);
    expect(nested.re[7 * 8 + 5]).toBe(last.re[6]);
    expect(unitarityDefect(nested)).toBeLessThan(ROUNDING);
    const filled = Array.from(nested.re, (re, k) => Math.hypot(re, nested.im[k]!)).filter((size) => size > 0);
    expect(filled).toHaveLength(4 + 1 + 2 + 9);
    // The same through the other way of evaluation.
    await expectMatrix('1*direct(dft(2), direct(-i, permutation([2,1])), haar(3, 7))', nested, 1e-300);
  });
});

describe('formulas', () => {
  it.each([
    ['[0,1;1,0]', EXCHANGE],
    ['[[0,1],[1,0]]', EXCHANGE],
    ["[0,1;1,0]'", EXCHANGE],
    ['-i*[0, j; i, 0]', EXCHANGE],
    ['-i*expm(i*pi/2*[0,1;1,0])', EXCHANGE],
    ['inv(permutation([2,1]))', EXCHANGE],
    ['concat([0;1], [1;0])', EXCHANGE],
    ['concat([0,1;1,0], zeros(1,2), 1) * [1,0;0,1]', undefined],
    ['kron(identity(1), [0,1;1,0])', EXCHANGE],
    ['[1;1]*[[1,1]] - identity(2)', EXCHANGE],
    ['ones(2,2) - diag([1,1])', EXCHANGE],
    ['diag([1,-1]) * [0,1;-1,0]', EXCHANGE],
    ['dft(4)^0 .* identity(4)', identityMatrix(4)],
    ['divide(dft(3), dft(3))', identityMatrix(3)],
    ["haar(4,2)*haar(4,2)'", identityMatrix(4)],
    ['adjoint(haar(4,2))', adjoint(haarUnitary(4, 2))],
    ['transpose(haar(4,2))', transpose(haarUnitary(4, 2))],
    ['conj(haar(4,2))', conjugate(haarUnitary(4, 2))],
    ['dft(3)^2 * dft(3)^-1', fourier(3)],
    ['[trace(identity(3)) - 3, det([2,1;1,1]); abs(3+4i)/5, log(8,2) - 3]', EXCHANGE],
    ['[\u22121+1, 50%*2; 1, 0]', EXCHANGE],
  ])('%s', async (text, expected) => {
    if (expected === undefined) await faultOfPromise(evaluateExpression(text), 'target/not-square');
    else await expectMatrix(text, expected);
  });

  it('a Mach-Zehnder cell equals the closed form of conventions, section 3', async () => {
    const [theta, phi] = [0.7, 1.9];
    const phase = (angle: number, size: number): [number, number] => [
      size * Math.cos(angle),
      size * Math.sin(angle),
    ];
    const [s, c] = [Math.sin(theta / 2), Math.cos(theta / 2)];
    const quarter = Math.PI / 2 + theta / 2;
    await expectMatrix(
      'splitter(1/2)*diag([exp(0.7i),1])*splitter(1/2)*diag([exp(1.9i),1])',
      matrixFromRows([
        [phase(quarter + phi, s), phase(quarter, c)],
        [phase(quarter + phi, c), phase(quarter, -s)],
      ]),
    );
  });

  it('expm of i times a Hermitian matrix is unitary, and undone by that of -i', async () => {
    const hermitian = "(haar(6,1)+haar(6,1)')";
    expect(unitarityDefect(await evaluateExpression(`expm(i*${hermitian})`))).toBeLessThan(1e-13);
    await expectMatrix(`expm(i*${hermitian})*expm(-i*${hermitian})`, identityMatrix(6), 1e-13);
  });

  it('multiplies like another program would, entry by entry', async () => {
    const product = multiply(haarUnitary(6, 1), haarUnitary(6, 2));
    await expectMatrix('haar(6,1)*haar(6,2)', product);
    await expectMatrix(
      'kron(haar(2,1), haar(3,2))',
      matrixOf(6, (row, column) => {
        const [a, b] = [haarUnitary(2, 1), haarUnitary(3, 2)];
        const k = Math.floor(row / 3) * 2 + Math.floor(column / 3);
        const l = (row % 3) * 3 + (column % 3);
        return [a.re[k]! * b.re[l]! - a.im[k]! * b.im[l]!, a.re[k]! * b.im[l]! + a.im[k]! * b.re[l]!];
      }),
    );
  });
});

describe('faults in formulas', () => {
  it.each([
    ['', 'target/empty', /no matrix/],
    [' # nothing', 'target/empty', /no matrix/],
    ['dft(2', 'target/syntax', /character 6/],
    ['[1,0;0,1', 'target/syntax', /character/],
    ['[1 0; 0 1]', 'target/syntax', /character 4/],
    ['dft(2)) ', 'target/syntax', /character 7/],
    ['dtf(4)', 'target/unknown-name', /"dtf"/],
    ['dft(n)', 'target/unknown-name', /"n"/],
    ['dft', 'target/argument', /stands here without arguments/],
    ['i(2)', 'target/argument', /not a function/],
    ['dft(2.5)', 'target/argument', /2.5/],
    ['dft(0)', 'target/argument', /0 is not a number of ports/],
    ['dft(2i)', 'target/argument', /real number/],
    ['dft(1,2)', 'target/argument', /one argument, not 2/],
    ['dft([2])', 'target/argument', /a number should stand/],
    ['haar(2,-1)', 'target/argument', /seed -1/],
    ['haar(2,1e300)', 'target/argument', /seed 1e\+300/],
    ['hadamard(6)', 'target/argument', /power of two/],
    ['permutation([1,3])', 'target/argument', /3 is not a port/],
    ['permutation([1,1])', 'target/argument', /twice/],
    ['permutation([])', 'target/empty', /no matrix/],
    ['permutation(2,1)', 'target/argument', /one list/],
    ['splitter(1.5)', 'target/argument', /\[0, 1\]/],
    ['direct([1,2,3], dft(2))', 'target/argument', /argument 1/],
    ['direct()', 'target/argument', /matrices/],
    ['sqrt(dft(2))', 'target/argument', /sqrt/],
    ['dft(2)*dft(3)', 'target/argument', /multiply/],
    ['dft(2)^0.5', 'target/argument', /integer/],
    ['dft(2)^4294967296', 'target/argument', /2\^31/],
    ['zeros(2,-1)', 'target/argument', /whole number/],
    ['inv([1,1;1,1])', 'target/argument', /inv/],
    ['5', 'target/not-square', /a number/],
    ['[1,2,3]', 'target/not-square', /a list/],
    ['[1,2,3;4,5,6]', 'target/not-square', /2 rows and 3 columns/],
    ['[dft(2), dft(2)]', 'target/not-square', /2 x 2 x 2/],
    ['[dft(2), dft(3)]', 'target/ragged', /differ in length/],
    ['[[1,2],3]', 'target/ragged', /differ in length/],
    ['dft(2)/0', 'target/not-finite', /divide/],
    ['1e400*dft(2)', 'target/not-finite', /not finite/],
    ['[NaN,0;0,1]', 'target/not-finite', /not finite/],
    ['Infinity', 'target/not-finite', /not finite/],
    ['1/2i*dft(2)', 'target/ambiguous', /two ways/],
    ['1/sqrt(2) dft(2)', 'target/ambiguous', /two ways/],
    ['2i^2*dft(2)', 'target/ambiguous', /two ways/],
    ['"dft(2)"', 'target/forbidden', /text/],
    ['true', 'target/forbidden', /truth/],
    ['1:1e9', 'target/forbidden', /range/],
    ['x = dft(2)', 'target/forbidden', /assignment/],
    ['f(x) = x', 'target/forbidden', /definition/],
    ['dft(2); dft(3)', 'target/forbidden', /statements/],
    ['1 > 0 ? dft(2) : dft(3)', 'target/forbidden', /condition/],
    ['{a: 1}', 'target/forbidden', /object/],
    ['dft(2).constructor', 'target/forbidden', /property/],
    ['dft(2)[1,1]', 'target/forbidden', /property or an entry/],
    ['5!', 'target/forbidden', /operator !/],
    ['dft(2) == dft(2)', 'target/forbidden', /operator ==/],
    ['2 cm', 'target/unknown-name', /"cm"/],
  ])('%s', async (text, code, message) => {
    expect((await faultOfPromise(evaluateExpression(text), code)).message).toMatch(message);
  });

  it('suggests the name that was meant', async () => {
    expect((await faultOfPromise(evaluateExpression('dtf(4)'), 'target/unknown-name')).remedy).toBe(
      'Did you mean dft?',
    );
    expect((await faultOfPromise(evaluateExpression('[Pi]'), 'target/unknown-name')).remedy).toBe(
      'Did you mean pi?',
    );
  });

  it.each([
    ...[
      'constructor',
      '__proto__',
      'toString',
      'hasOwnProperty',
      'valueOf',
      'prototype',
      'import',
      'createUnit',
    ],
    ...[
      'parse',
      'parser',
      'compile',
      'evaluate',
      'simplify',
      'derivative',
      'config',
      'typed',
      'help',
      'unit',
      'map',
    ],
    ...['forEach', 'random', 'bignumber', 'sparse', 'matrix', 'range', 'eigs', 'process', 'globalThis'],
    ...['resolve', 'chain', 'string', 'format', 'print', 'factorial', 'subset', 'resize', 'fft', 'reviver'],
  ])('the name %s cannot be used, as a name or as a function', async (name) => {
    for (const text of [`[${name}]`, `${name}(2)`, `${name}("2")`, `dft(2)*${name}(1, 2)`]) {
      await faultOfPromise(evaluateExpression(text), '(target/forbidden|target/unknown-name)');
    }
  });
});

describe('bounds', () => {
  it.each([
    ...['dft(5)', 'haar(5,1)', 'hadamard(8)', 'identity(5)', 'permutation([1,2,3,4,5])', 'direct(dft(4),1)'],
    ...['zeros(5,5)', 'zeros(1e9,1e9)', 'ones(1e9)', 'zeros([9,9])', 'zeros(2,2,2,2,2)', 'diag([1,2,3,4,5])'],
    ...[
      'diag([1,2],1e9)',
      'kron(dft(4),dft(4))',
      'kron(dft(2),dft(3))',
      'concat(dft(4),dft(4))',
      '[1,2,3,4,5]',
    ],
    ...[
      'concat(dft(4),zeros(4,1))',
      'ones(4,1)*ones(1,4) + zeros(5,1)',
      'dft(1e9)',
      'direct(dft(4),dft(4),dft(4))',
    ],
    ...['kron([1,2,3],[1,2,3])', 'identity(1e308)', '[1;2;3;4;5]*[[1,2]]'],
  ])('%s is over four ports', async (text) => {
    await faultOfPromise(evaluateExpression(text, { maxModes: 4 }), 'target/too-large');
    if (!/\D[1-9]$|1e/.test(text))
      await faultOfPromise(evaluateExpression(`1*${text}`, { maxModes: 4 }), 'target/too-large');
  });

  it('four ports are within four ports', async () => {
    for (const text of ['dft(4)', 'kron(dft(2),dft(2))', '[1;2;3;4]*[[1,2,3,4]]', 'ones(4,1)+ones(1,4)']) {
      expect((await evaluateExpression(text, { maxModes: 4 })).rows).toBe(4);
    }
  });

  it.each([
    ['brackets', `${'('.repeat(100)}1${')'.repeat(100)}`],
    ['calls', `${'direct('.repeat(100)}1${')'.repeat(100)}`],
    ['many brackets', '['.repeat(99_999)],
    ['signs', `${'-'.repeat(90_000)}1`],
    ['sums', `1${'+1'.repeat(45_000)}`],
    ['powers', `2${'^2'.repeat(45_000)}`],
    ['apostrophes', `dft(2)${"'".repeat(90_000)}`],
    ['joined factors', `1${' i'.repeat(45_000)}`],
  ])('deep nesting of %s is refused and does not exhaust the stack', async (_, text) => {
    await faultOfPromise(evaluateExpression(text), 'target/too-deep');
  });

  it('long texts and too many matrices on the way are refused', async () => {
    await faultOfPromise(evaluateExpression('1'.repeat(100_001)), 'target/too-large');
    const many = `0*direct(${Array.from({ length: 40 }, () => 'identity(256)').join(',')})`;
    await faultOfPromise(evaluateExpression(many, { maxModes: 256 }), 'target/too-much-work');
    await faultOfPromise(evaluateExpression(many.slice(2), { maxModes: 256 }), 'target/too-much-work');
  });

  it('a time limit stops the work of a formula, and its error is told as such', async () => {
    const timeLimit = <T>(run: () => T): T => {
      const script = new vm.Script('run()');
      return script.runInNewContext({ run }, { timeout: 60 }) as T;
    };
    await faultOfPromise(
      evaluateExpression('inv(haar(200,1))*haar(200,1)', { timeLimit }),
      'target/too-much-work',
    );
    // A call of ours with numbers is bounded by its size, and is let be.
    await expect(evaluateExpression('haar(200, 1)', { timeLimit })).resolves.toHaveProperty('rows', 200);
    await expect(evaluateExpression('dft(2)*[0,1;1,0]', { timeLimit })).resolves.toHaveProperty('rows', 2);
    await faultOfPromise(evaluateExpression('dft(2)*dft(3)', { timeLimit }), 'target/argument');
    await faultOfPromise(evaluateExpression('haar(3)', { timeLimit }), 'target/haar-seed');
  });
});

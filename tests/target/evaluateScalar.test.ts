import * as mathjs from 'mathjs';
import { describe, expect, it } from 'vitest';
import { evaluateScalar } from '../../src/target/evaluateScalar.js';
import { faultOf } from './support.js';

describe('complex scalars', () => {
  // The oracle is mathjs, another program: same text, same value.
  it.each([
    '1+2*3-4/5',
    '2^3^2',
    '-2^2',
    '2^-1',
    '(1+i)^2',
    '(1+2i)^-3',
    '(-8)^(1/3)',
    'i^i',
    '1/(1+2i)',
    '(3+4i)/(1e-200*i)',
    '(3+4i)/(1e300-1e299*i)',
    'sqrt(-1)',
    'sqrt(3+4i)',
    'sqrt(-3-4i)',
    'sqrt(-1e-20+1e-30i)',
    'exp(i*pi/4)',
    'exp(1-2i)',
    'log(-1)',
    'arg(-1)',
    'arg(conj(-1))',
    'log(2-3i)',
    'sin(1+2i)',
    'cos(1-2i)',
    'tan(0.3+0.2i)',
    'sin(0.5)',
    'asin(0.5)',
    'acos(-1)',
    'atan(2)',
    'abs(3-4i)',
    'arg(-1+i)',
    'conj(1+2i)',
    're(1+2i)',
    'im(1+2i)',
    'e^(2 pi i/3)',
    '2 sqrt(2)',
    '3(1+i)',
    '-(-(2))',
    '1 - -1',
    '1.5e-3*1E2',
  ])('%s', (text) => {
    const value = evaluateScalar(text);
    const oracle = mathjs.complex(mathjs.evaluate(text) as mathjs.Complex);
    const size = Math.hypot(oracle.re, oracle.im);
    // A few roundings, each of relative size 1.1e-16.
    expect(Math.hypot(value.re - oracle.re, value.im - oracle.im) / size).toBeLessThan(1e-15);
  });

  it('knows j, cis and exact powers', () => {
    expect(evaluateScalar('1+2j')).toEqual({ re: 1, im: 2 });
    expect(evaluateScalar('cis(pi)').re).toBe(-1);
    expect(evaluateScalar('(1+i)^2')).toEqual({ re: 0, im: 2 });
    expect(evaluateScalar('i^3').im).toBe(-1);
  });

  it.each([
    ['', 'target/entry', /ends/],
    ['1+', 'target/entry', /ends/],
    ['(1', 'target/entry', /closing parenthesis/],
    ['1)', 'target/entry', /"\)" is not expected/],
    ['1 2', 'target/entry', /"2" is not expected/],
    ['*1', 'target/entry', /stands where a number should/],
    ['sqrt', 'target/entry', /parentheses/],
    ['sqrt(1,2)', 'target/entry', /closing parenthesis/],
    ['asin(2)', 'target/entry', /not defined/],
    ['1**2', 'target/entry', /stands where/],
    ['a.b', 'target/unknown-name', /"a"/],
    ['constructor', 'target/unknown-name', /"constructor"/],
    ['__proto__(1)', 'target/unknown-name', /"__proto__"/],
    ['toString(1)', 'target/unknown-name', /"toString"/],
    ['sqr(2)', 'target/unknown-name', /"sqr"/],
    ['1/2i', 'target/ambiguous', /two ways/],
    ['1/-2i', 'target/ambiguous', /two ways/],
    ['1/2 pi', 'target/ambiguous', /two ways/],
    ['2i^2', 'target/ambiguous', /two ways/],
    [`${'('.repeat(1000)}1${')'.repeat(1000)}`, 'target/entry', /64 levels/],
    [`${'-'.repeat(100000)}1`, 'target/entry', /64 levels/],
    [`2${'^2'.repeat(100000)}`, 'target/entry', /64 levels/],
  ])('refuses %j', (text, code, message) => {
    expect(faultOf(() => evaluateScalar(text), code).message).toMatch(message);
  });

  it('suggests the name that was meant', () => {
    expect(faultOf(() => evaluateScalar('sqr(2)'), 'target/unknown-name').remedy).toBe('Did you mean sqrt?');
  });
});

import { InputError } from '../errors/InputError.js';
import { nearestName } from '../errors/nearestName.js';
import type { Complex } from './Complex.js';
import {
  addComplex,
  angleOf,
  cosine,
  divideComplex,
  exponential,
  logarithm,
  multiplyComplex,
  negateComplex,
  power,
  real,
  sine,
  squareRoot,
  subtractComplex,
} from './Complex.js';
import { cut } from './limits.js';

/** Levels of brackets, signs and powers within one another, so that no text can exhaust the stack. */
const MAX_DEPTH = 64;

const CONSTANTS: ReadonlyMap<string, Complex> = new Map([
  ['i', { re: 0, im: 1 }],
  ['j', { re: 0, im: 1 }],
  ['pi', real(Math.PI)],
  ['e', real(Math.E)],
]);

const FUNCTIONS: ReadonlyMap<string, (z: Complex) => Complex> = new Map([
  ['sqrt', squareRoot],
  ['exp', exponential],
  ['cis', (z: Complex) => exponential({ re: -z.im, im: z.re })],
  ['log', logarithm],
  ['sin', sine],
  ['cos', cosine],
  ['tan', (z: Complex) => divideComplex(sine(z), cosine(z))],
  ['abs', (z: Complex) => real(Math.hypot(z.re, z.im))],
  ['arg', (z: Complex) => real(angleOf(z))],
  ['conj', (z: Complex) => ({ re: z.re, im: -z.im })],
  ['re', (z: Complex) => real(z.re)],
  ['im', (z: Complex) => real(z.im)],
  ['asin', ofReal('asin', Math.asin)],
  ['acos', ofReal('acos', Math.acos)],
  ['atan', ofReal('atan', Math.atan)],
]);

/**
 * The value of a complex scalar as a person writes it: numbers, `i` or `j`, `pi`, `e`, `+ - * / ^`,
 * parentheses, and sqrt, exp, cis (e^{iz}), log, sin, cos, tan, asin, acos, atan (of real numbers), abs, arg,
 * conj, re, im of one argument. A factor may stand directly before a name or a parenthesis (`2i`, `3
 * sqrt(2)`); `1/2i` and `2i^2`, which programs read in two ways, are refused. Works on the text alone: no
 * names of the host language can be reached.
 * @throws InputError `target/entry`, `target/unknown-name` or `target/ambiguous`. The value may be infinite
 * or NaN.
 */
export function evaluateScalar(text: string): Complex {
  return new ScalarReader(text).read();
}

/** A recursive descent over the text; one method a level of precedence. */
class ScalarReader {
  private at = 0;
  private depth = 0;
  private readonly text: string;

  constructor(text: string) {
    // The typographic minus arrives with text pasted from papers.
    this.text = text.replaceAll('\u2212', '-');
  }

  read(): Complex {
    const value = this.sum();
    if (this.peek() !== '') throw this.fault(`${quote(this.text.slice(this.at))} is not expected`);
    return value;
  }

  private sum(): Complex {
    let value = this.product();
    for (;;) {
      if (this.take('+')) value = addComplex(value, this.product());
      else if (this.take('-')) value = subtractComplex(value, this.product());
      else return value;
    }
  }

  private product(): Complex {
    let value = this.signed().value;
    for (;;) {
      if (this.take('*')) value = multiplyComplex(value, this.signed().value);
      else if (this.take('/')) {
        const divisor = this.signed();
        if (divisor.joined) throw this.ambiguous('a division by a product without a sign, such as 1/2i,');
        value = divideComplex(value, divisor.value);
      } else return value;
    }
  }

  private signed(): { value: Complex; joined: boolean } {
    if (this.take('+')) return this.deeper(() => this.signed());
    if (this.take('-')) {
      const { value, joined } = this.deeper(() => this.signed());
      return { value: negateComplex(value), joined };
    }
    return this.joinedFactors();
  }

  /** Factors without a sign between them: `2i`, `2 pi i`, `3 sqrt(2)`. */
  private joinedFactors(): { value: Complex; joined: boolean } {
    let value = this.powerOf();
    let joined = false;
    while (/[A-Za-z(]/.test(this.peek())) {
      const start = this.at;
      value = multiplyComplex(value, this.powerOf());
      joined = true;
      if (/^[ij]\s*\^/.test(this.text.slice(start))) throw this.ambiguous('a power of 2i');
    }
    return { value, joined };
  }

  private powerOf(): Complex {
    const base = this.atom();
    if (!this.take('^')) return base;
    const exponent = this.deeper(() => this.signedPower());
    return power(base, exponent);
  }

  private signedPower(): Complex {
    if (this.take('+')) return this.deeper(() => this.signedPower());
    if (this.take('-')) return negateComplex(this.deeper(() => this.signedPower()));
    return this.powerOf();
  }

  private atom(): Complex {
    const next = this.peek();
    if (next === '(') return this.bracketed();
    const number = this.match(/(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?/y);
    if (number !== undefined) return real(Number(number));
    const name = this.match(/[A-Za-z_][A-Za-z_0-9]*/y);
    if (name !== undefined) return this.named(name);
    if (next === '') throw this.fault('it ends where a number should stand');
    throw this.fault(`${quote(this.text.slice(this.at))} stands where a number should`);
  }

  private named(name: string): Complex {
    const apply = FUNCTIONS.get(name);
    if (apply !== undefined) {
      if (this.peek() !== '(') throw this.fault(`${name} needs its argument in parentheses`);
      return apply(this.bracketed());
    }
    const constant = CONSTANTS.get(name);
    if (constant === undefined) throw unknownName(name);
    return constant;
  }

  private bracketed(): Complex {
    this.take('(');
    const value = this.deeper(() => this.sum());
    if (!this.take(')')) throw this.fault('a closing parenthesis is missing');
    return value;
  }

  private deeper<T>(read: () => T): T {
    if (++this.depth > MAX_DEPTH) throw this.fault(`it is nested more than ${MAX_DEPTH} levels deep`);
    const value = read();
    this.depth--;
    return value;
  }

  private peek(): string {
    while (/\s/.test(this.text[this.at] ?? '')) this.at++;
    return this.text[this.at] ?? '';
  }

  private take(sign: string): boolean {
    if (this.peek() !== sign) return false;
    this.at++;
    return true;
  }

  private match(pattern: RegExp): string | undefined {
    pattern.lastIndex = this.at;
    const found = pattern.exec(this.text)?.[0];
    if (found !== undefined) this.at += found.length;
    return found;
  }

  private fault(why: string): InputError {
    return new InputError(
      'target/entry',
      `${quote(this.text)} is not a number: ${why}`,
      'Write a number such as 0.5, 0.5-0.5i, 1/sqrt(2) or exp(i*pi/4).',
    );
  }

  private ambiguous(what: string): InputError {
    return new InputError(
      'target/ambiguous',
      `${quote(this.text)}: ${what} can be read in two ways`,
      'Write the parentheses out: (1/2)i or 1/(2i), (2i)^2 or 2*(i^2).',
    );
  }
}

function unknownName(name: string): InputError {
  const near = nearestName(name, [...FUNCTIONS.keys(), ...CONSTANTS.keys()]);
  return new InputError(
    'target/unknown-name',
    `${quote(name)} is not a number or a known name`,
    near === undefined
      ? 'Write a number such as 0.5, 0.5-0.5i, 1/sqrt(2) or exp(i*pi/4).'
      : `Did you mean ${near}?`,
  );
}

function ofReal(name: string, apply: (x: number) => number): (z: Complex) => Complex {
  return (z) => {
    const value = z.im === 0 ? apply(z.re) : NaN;
    if (!Number.isNaN(value)) return real(value);
    throw new InputError(
      'target/entry',
      `${name} is not defined here for this argument`,
      'In a file, inverse sines and cosines take real arguments within their range; a formula takes complex ones.',
    );
  };
}

function quote(text: string): string {
  return `"${cut(text)}"`;
}

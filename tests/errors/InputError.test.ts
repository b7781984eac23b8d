import { describe, expect, it } from 'vitest';
import { InputError } from '../../src/errors/InputError.js';

describe('InputError', () => {
  it('puts the place before what is wrong, in the order source, row, column, field', () => {
    const place = { field: 'matrix', column: 3, row: 2, source: 'target.csv' };
    const error = new InputError('target/entry', 'cannot read "abc"', 'write a number', place);
    expect(error.message).toBe('target.csv, row 2, column 3, matrix: cannot read "abc"');
    expect(error.remedy).toBe('write a number');
    expect(error.code).toBe('target/entry');
    expect(error.place).toEqual(place);
    expect(error.name).toBe('InputError');
    expect(error).toBeInstanceOf(Error);
  });

  it('says what is wrong alone when there is no place', () => {
    expect(new InputError('a/b', 'no input', 'give a file').message).toBe('no input');
  });

  it('is one line, whatever it quotes', () => {
    const nasty = 'first\nsecond\r\nthird\u2028fourth\u0000fifth\u001b[31m\n';
    const error = new InputError('a/b', nasty, nasty, { source: 'a\nb.csv' });
    for (const text of [error.message, error.remedy]) {
      // No character that ends a line or moves a cursor (Unicode: control, line and paragraph separators).
      expect(text).not.toMatch(/[\p{Cc}\p{Zl}\p{Zp}]/u);
      expect(text).toContain('first second third fourth fifth [31m');
    }
    expect(error.message).toMatch(/^a b\.csv: first/);
  });

  it('keeps its cause', () => {
    const cause = new Error('lower');
    expect(new InputError('a/b', 'c', 'd', {}, { cause }).cause).toBe(cause);
  });
});

describe('withSource', () => {
  it('names the source of a fault that does not know it, and keeps the rest', () => {
    const bare = new InputError('a/b', 'bad', 'mend it');
    const named = bare.withSource('x.json');
    expect(named.message).toBe('x.json: bad');
    expect([named.code, named.remedy, named.cause]).toEqual(['a/b', 'mend it', bare]);
    const field = new InputError('a/b', 'bad', 'mend it', { field: 'modes' }).withSource('x.json');
    expect(field.place).toEqual({ source: 'x.json', field: 'modes' });
  });

  it('does not rename one that does', () => {
    const error = new InputError('a/b', 'bad', 'mend it', { source: 'inner.csv', row: 1 });
    expect(error.withSource('outer.csv')).toBe(error);
  });
});

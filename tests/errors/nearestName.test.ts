import { describe, expect, it } from 'vitest';
import { nearestName } from '../../src/errors/nearestName.js';

const KEYS = ['modes', 'layout', 'mirror', 'couplingRatio', 'measuredCells', 'lossDb', 'name', 'note'];

describe('nearestName', () => {
  it.each([
    ['mode', 'modes', 'a letter left out'],
    ['modess', 'modes', 'a letter too many'],
    ['moces', 'modes', 'another letter'],
    ['mdoes', 'modes', 'neighbours exchanged'],
    ['CouplingRatio', 'couplingRatio', 'another case'],
    ['LOSSDB', 'lossDb', 'another case throughout'],
    ['coupling_ratios', 'couplingRatio', 'two letters too many'],
    ['layuot', 'layout', 'neighbours exchanged'],
    ['modes', 'modes', 'the name itself'],
  ])('takes %s for %s: %s', (name, meant) => {
    expect(nearestName(name, KEYS)).toBe(meant);
  });

  it('counts an exchange of neighbours as one slip, not two', () => {
    // A third of four letters is one slip.
    expect(nearestName('naem', ['name'])).toBe('name');
    expect(nearestName('nxxe', ['name'])).toBeUndefined();
  });

  it('takes the nearest of several, the first of equally near ones', () => {
    expect(nearestName('nate', ['note', 'name'])).toBe('note');
    expect(nearestName('columms', ['column', 'columns'])).toBe('columns');
  });

  it('suggests nothing when more than a third of the letters differ', () => {
    expect(nearestName('temperature', KEYS)).toBeUndefined();
    expect(nearestName('abcdef', ['abcxyz'])).toBeUndefined();
    expect(nearestName('abcdef', ['abcdxy'])).toBe('abcdxy');
    expect(nearestName('anything', [])).toBeUndefined();
  });

  it('takes any iterable, and does not choke on a very long name', () => {
    expect(nearestName('laout', new Set(KEYS))).toBe('layout');
    expect(nearestName('x'.repeat(1_000_000), KEYS)).toBeUndefined();
  });
});

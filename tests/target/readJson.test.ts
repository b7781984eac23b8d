import { describe, expect, it } from 'vitest';
import { readMatrices } from '../../src/target/readMatrices.js';
import { bytesOf, faultOf, rowsFrom } from './support.js';

describe('JSON', () => {
  it.each([
    ['a bare array', '[[0.5, [0, -1]], [{"re": 1, "im": 2}, "1/2"]]'],
    ['a document', '\ufeff {"name": "x", "matrix": [["0.5", "-i"], ["1+2j", 0.5]], "deep": [[[[1]]]]}\n'],
    [
      'a key that means something elsewhere',
      '{"__proto__": {"matrix": 1}, "matrix": [[0.5,[0,-1]],[[1,2],0.5]]}',
    ],
  ])('with %s', (_, text) => {
    expect(rowsFrom(text, 'json').map((row) => row.map((entry) => entry.map((x) => x + 0)))).toEqual([
      [
        [0.5, 0],
        [0, -1],
      ],
      [
        [1, 2],
        [0.5, 0],
      ],
    ]);
    expect(({} as Record<string, unknown>)['matrix']).toBeUndefined();
  });

  it.each([
    ['', 'target/empty', /no matrix/],
    ['[]', 'target/empty', /no matrix/],
    ['[[]]', 'target/empty', /no matrix/],
    ['[[1, 0], [0]]', 'target/ragged', /row 2: 1 entry, but row 1 has 2/],
    ['[[1, 0]]', 'target/not-square', /1 row and 2 columns/],
    ['[1, 0]', 'target/json', /row 1: 1 is not a row/],
    ['[[1, 0], [0, null]]', 'target/entry', /row 2, column 2: null/],
    ['[[1, 0], [0, [1, 2, 3]]]', 'target/entry', /row 2, column 2: \[1,2,3\]/],
    ['[[1, 0], [0, {"re": 1}]]', 'target/entry', /row 2, column 2: an object/],
    ['[[1, 0], [0, {"re": 1, "im": 0, "abs": 1}]]', 'target/entry', /row 2, column 2/],
    ['[[1, 0], [0, {"re": "1", "im": 0}]]', 'target/entry', /row 2, column 2/],
    ['[[1, "y"], [0, 1]]', 'target/unknown-name', /row 1, column 2: "y"/],
    ['[[1, 1e999], [0, 1]]', 'target/not-finite', /row 1, column 2/],
    ['[[1, [0, 1e999]], [0, 1]]', 'target/not-finite', /row 1, column 2/],
    ['[[1, NaN], [0, 1]]', 'input/not-finite', /NaN or Infinity/],
    ['[[1, 0], [0, 1', 'input/not-json', /not JSON/],
    ['[[1, 0],\n [0 1]]', 'input/not-json', /line 2, character 5/],
    ['"matrix"', 'target/json', /no matrix/],
    ['{"matrix": 3}', 'target/json', /"matrix" holds 3/],
    ['{"rows": []}', 'target/json', /no key "matrix"/],
    ['{"format": 1, "phases": []}', 'target/wrong-file', /phase table/],
    ['{"format": 1, "modes": 4}', 'target/wrong-file', /chip file/],
    ['{"format": 1}', 'target/wrong-file', /another file/],
  ])('refuses %j', (text, code, message) => {
    expect(faultOf(() => readMatrices(bytesOf(text), 'json'), code).message).toMatch(message);
  });

  it('bounds the nesting before it parses, and does not count brackets in quotes', () => {
    const many = 100_000;
    faultOf(() => readMatrices(bytesOf('['.repeat(many)), 'json'), 'input/too-deep');
    faultOf(() => readMatrices(bytesOf('['.repeat(many) + ']'.repeat(many)), 'json'), 'input/too-deep');
    faultOf(() => readMatrices(bytesOf('{"a":'.repeat(many)), 'json'), 'input/too-deep');
    expect(rowsFrom(`{"note": "\\"${'['.repeat(100)}", "matrix": [[1]]}`, 'json')).toEqual([[[1, 0]]]);
  });

  it('bounds the size', () => {
    faultOf(
      () => readMatrices(bytesOf('[[1,0,0],[0,1,0],[0,0,1]]'), 'json', { maxModes: 2 }),
      'target/too-large',
    );
  });
});

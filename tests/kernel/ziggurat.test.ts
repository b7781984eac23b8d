import { expect, it } from 'vitest';
import { DENSITIES_AT, writeZiggurat, ZIGGURAT_SIZE } from '../../src/kernel/ziggurat.js';
import { complementaryErrorFunction } from '../../src/statistics/normalDistribution.js';

const tables = new Float64Array(ZIGGURAT_SIZE);
writeZiggurat(tables);
const edge = (layer: number): number => tables[2 * layer]!;
const density = (x: number): number => Math.exp(-0.5 * x * x);

// Marsaglia and Tsang, J. Stat. Softw. 5, 8 (2000): all layers have one area, the lowest with the tail that
// it stands for; the last one ends at the peak. The two constants hold for
// no others.
it('has layers of one area that end at the peak of the density', () => {
  const area = edge(0) * density(edge(1));
  const tail = Math.sqrt(Math.PI / 2) * complementaryErrorFunction(edge(1) / Math.SQRT2);
  expect((edge(1) * density(edge(1)) + tail) / area).toBeCloseTo(1, 10);
  for (let layer = 1; layer < 511; layer++) {
    expect((edge(layer) * (density(edge(layer + 1)) - density(edge(layer)))) / area).toBeCloseTo(1, 9);
  }
  expect((edge(511) * (1 - density(edge(511)))) / area).toBeCloseTo(1, 7);
});

it('has the shares and densities that belong to the edges', () => {
  for (let layer = 0; layer < 512; layer++) {
    expect(tables[2 * layer + 1]! * edge(layer)).toBeCloseTo(edge(layer + 1), 15);
    expect(tables[DENSITIES_AT + layer]).toBe(density(edge(layer)));
  }
  expect([edge(512), tables[DENSITIES_AT + 512]]).toEqual([0, 1]);
});

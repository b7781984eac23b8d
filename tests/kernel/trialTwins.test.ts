import { describe, expect, it } from 'vitest';
import { layersIn } from '../support/ziggurat.js';
import type { KernelInstance, Kernels } from '../../src/kernel/loadKernels.js';
import { loadKernels, BLOCK_SIZE } from '../../src/kernel/loadKernels.js';
import { twinInstance } from '../../src/kernel/twins.js';

const BOTH: readonly (readonly [name: string, make: () => KernelInstance])[] = [
  ['compiled kernels', () => loadKernels()],
  ['twins', () => twinInstance()],
];

const SIZES = [0, 1, 2, 3, 4, 5, 7, 8, 9, 16, 31, 32, 63, 64];

/** Lays out arrays of a size and calls a kernel on them. */
type Run = (instance: KernelInstance, size: number) => void;

/** All bytes that a run has reserved, and the gaps around its arrays. */
function memoryAfter(instance: KernelInstance, run: Run, size: number): Uint8Array {
  const start = instance.reserveBytes(64);
  run(instance, size);
  const end = instance.reserveBytes(64);
  return instance.bytes(start, end - start);
}

/** Reserves an array and fills it with numbers of both signs around 1 that depend on `salt`. */
function filled(instance: KernelInstance, length: number, salt: number): number {
  const address = instance.reserve(length);
  instance.doubles(address, length).set(Array.from({ length }, (_, k) => 1.5 * Math.sin(salt + 1.3 * k)));
  return address;
}

/** Reserves an array of coupling ratios, both ends among them. */
function ratiosOf(instance: KernelInstance, length: number, salt: number): number {
  const address = filled(instance, length, salt);
  const ratios = instance.doubles(address, length);
  ratios.forEach((value, k) => (ratios[k] = Math.min(1, Math.max(0, 0.5 + value / 2))));
  return address;
}

function placesOf(instance: KernelInstance, values: readonly number[]): number {
  const address = instance.reserveBytes(4 * values.length);
  instance.integers(address, values.length).set(values);
  return address;
}

/**
 * One run for each kernel that is called by itself; the panels and the judge are run as the engine runs them,
 * in trialEngines.
 */
const RUNS: Readonly<Partial<Record<keyof Kernels, Run>>> = {
  seedTrials: (instance, size) => {
    // Words with the upper bit set as well: in WebAssembly they are signed or unsigned alike.
    instance.kernels.seedTrials(instance.reserve(4), size, 0xffffffff - size, 8, 0xdeadbeef);
    instance.kernels.seedTrials(instance.reserve(4), 0x89abcdef, 7, 0xffffffff, size);
  },
  fillNormals: (instance, size) => {
    const state = instance.reserve(4);
    // Enough of them that many fall beyond their layer, and some into the tail.
    const out = instance.reserve(2 * 400 * size);
    const layers = layersIn(instance);
    instance.kernels.seedTrials(state, 1, 2, 3, size);
    instance.kernels.fillNormals(out, 400 * size, state, layers);
  },
  fillUniforms: (instance, size) => {
    const state = instance.reserve(4);
    const out = instance.reserve(2 * size);
    instance.kernels.seedTrials(state, 1, 2, 3, size);
    instance.kernels.fillUniforms(out, size, state);
  },
  correlateGrid: (instance, size) => {
    const grid = filled(instance, 2 * 5 * size, 1);
    instance.kernels.correlateGrid(grid, 5, size, 0.7, 0.2);
    const other = filled(instance, 2 * 5 * size, 2);
    instance.kernels.correlateGrid(other, size, 5, 0.9, 0);
  },
  pickPlaces: (instance, size) => {
    const grid = filled(instance, 2 * 100, 1);
    const places = placesOf(
      instance,
      Array.from({ length: size }, (_, k) => (37 * k) % 100),
    );
    const out = filled(instance, 4 * size + 2, 3);
    instance.kernels.pickPlaces(out, 32, grid, places, size);
  },
  correlatePairs: (instance, size) => {
    const numbers = filled(instance, 4 * size + 2, 4);
    instance.kernels.correlatePairs(numbers, size, -0.6);
  },
  drawRatios: (instance, size) => {
    const nominal = filled(instance, size, 5);
    const numbers = filled(instance, 2 * size, 6);
    const shift = filled(instance, 2, 7);
    const clamped = instance.reserve(2);
    const ratios = instance.reserve(2 * size);
    instance.kernels.drawRatios(ratios, size, nominal, numbers, 0.4, shift, clamped);
    instance.kernels.drawRatios(ratios, size, nominal, numbers, 0.4, shift, clamped);
  },
  turnRatios: (instance, size) => {
    const ratios = ratiosOf(instance, 2 * size, 8);
    instance.kernels.turnRatios(ratios, size, filled(instance, 2 * size, 9), 6);
  },
  turnFactors: (instance, size) => {
    const factors = filled(instance, 8 * size + 4, 10);
    instance.kernels.turnFactors(factors, 64, size, filled(instance, 2 * size, 11), 500);
  },
  composeCells: (instance, size) => {
    const upper = placesOf(
      instance,
      Array.from({ length: size }, (_, k) => (5 * k) % 9),
    );
    const arrays = [8, 4, 2].map((length, k) => filled(instance, length * size, 13 + k));
    const [arms, external, gain] = arrays as [number, number, number];
    const ratios = ratiosOf(instance, 6 * size, 12);
    const coefficients = instance.reserve(10 * size);
    const input = filled(instance, 40, 16);
    const factors = instance.reserve(40);
    for (const place of [0, 1, 2, 3]) {
      for (const [real, splitters] of [
        [0, 2],
        [1, 2],
        [0, 3],
        [1, 3],
      ] as const) {
        instance.kernels.composeCells(
          size,
          upper,
          ratios,
          arms,
          external,
          gain,
          10,
          input,
          factors,
          instance.reserve(BLOCK_SIZE),
          coefficients,
          place,
          real,
          splitters,
        );
        // The next cells take up what these left, brought back to where it neither vanishes nor overflows.
        const [view, left] = [instance.doubles(input, 40), instance.doubles(factors, 40)];
        left.forEach((value, k) => (view[k] = value + Math.sin(k + place)));
      }
    }
  },
};

describe.each(Object.entries(RUNS))('%s', (_, run) => {
  it('leaves the same bits as its twin, and all around its arrays', () => {
    for (const size of SIZES) {
      const [compiled, plain] = BOTH.map(([, make]) => memoryAfter(make(), run, size));
      expect(plain, `size ${size}`).toEqual(compiled);
    }
  });
});

describe('an instance of twins', () => {
  it('keeps what is written when its memory grows', () => {
    const instance = twinInstance();
    const first = instance.reserve(10);
    instance.doubles(first, 10).fill(7);
    const second = instance.reserve(1e6);
    expect(second % 16).toBe(0);
    expect(Array.from(instance.doubles(first, 10))).toEqual(new Array(10).fill(7));
    expect(instance.doubles(second, 1e6).every((value) => value === 0)).toBe(true);
  });

  it('says so when a kernel has no twin, and takes one from the caller', () => {
    expect(() => twinInstance().kernels.nullTriangular(1, 0, 8, 0, 0, 0, 0, 0)).toThrow('no twin');
    const called: number[] = [];
    const { kernels } = twinInstance({ nullTriangular: (modes) => called.push(modes) });
    kernels.nullTriangular(5, 0, 8, 0, 0, 0, 0, 0);
    expect(called).toEqual([5]);
  });
});

describe.each(BOTH)('%s', (_, make) => {
  // The polynomials against the functions of the language, over many turns and both signs; 1.1e-16 measured.
  it('turn factors by the sine and cosine of the language', () => {
    const instance = make();
    const count = 4001;
    const factors = instance.reserve(4 * count);
    const numbers = instance.reserve(2 * count);
    for (const largest of [3.2, 1000]) {
      const angles = Array.from({ length: 2 * count }, (_, k) => (k / count - 1) * largest);
      instance.doubles(numbers, 2 * count).set(angles);
      const view = instance.doubles(factors, 4 * count);
      view.forEach((_, k) => (view[k] = k % 4 < 2 ? 1 : 0));
      instance.kernels.turnFactors(factors, 32, count, numbers, 1);
      let worst = 0;
      angles.forEach((angle, k) => {
        const at = 4 * (k >> 1) + (k % 2);
        const [re, im] = [view[at]! - Math.cos(angle), view[at + 2]! - Math.sin(angle)];
        worst = Math.max(worst, Math.abs(re), Math.abs(im));
      });
      expect(worst).toBeLessThan(2.5e-16);
    }
  });

  it('draw the ratios that are asked for and count those beyond the ends', () => {
    const instance = make();
    const nominal = instance.reserve(3);
    const numbers = instance.reserve(6);
    const shift = instance.reserve(2);
    const clamped = instance.reserve(2);
    const ratios = instance.reserve(6);
    instance.doubles(nominal, 3).set([0.5, 0.2, 0.9]);
    instance.doubles(numbers, 6).set([1, -1, -2, 3, 4, 0]);
    instance.doubles(shift, 2).set([0.05, -0.05]);
    instance.kernels.drawRatios(ratios, 3, nominal, numbers, 0.2, shift, clamped);
    const expected = [0.75, 0.25, 0, 0.75, 1, 0.85];
    instance.doubles(ratios, 6).forEach((ratio, k) => expect(ratio).toBeCloseTo(expected[k]!, 15));
    expect(Array.from(instance.integers(clamped, 4))).toEqual([2, 0, 0, 0]);
  });

  // Pairs of normals lie within radius 1 with probability 1 - exp(-1/2), and in every octant alike.
  it('make pairs of normals with radii and angles as they must be', () => {
    const instance = make();
    const state = instance.reserve(4);
    const count = 20_000;
    const out = instance.reserve(2 * count);
    const layers = layersIn(instance);
    instance.kernels.seedTrials(state, 5, 0, 4, 0);
    instance.kernels.fillNormals(out, count, state, layers);
    const view = instance.doubles(out, 2 * count);
    for (const lane of [0, 1]) {
      const octants = new Float64Array(8);
      let inside = 0;
      for (let k = 0; k < count; k += 2) {
        const [x, y] = [view[2 * k + lane]!, view[2 * k + 2 + lane]!];
        if (x * x + y * y < 1) inside++;
        octants[Math.floor((Math.atan2(y, x) / Math.PI + 1) * 4) % 8]!++;
      }
      const pairs = count / 2;
      const share = 1 - Math.exp(-0.5);
      expect(Math.abs(inside - share * pairs)).toBeLessThan(4 * Math.sqrt(share * (1 - share) * pairs));
      octants.forEach((found) =>
        expect(Math.abs(found - pairs / 8)).toBeLessThan(4 * Math.sqrt((pairs * 7) / 64)),
      );
    }
  });
});

import { describe, expect, it } from 'vitest';
import type { Chip } from '../../src/chip/Chip.js';
import { idealChip } from '../../src/chip/idealChip.js';
import { settingsFromPhases, shifterCount } from '../../src/chip/shifters.js';
import type { KernelInstance } from '../../src/kernel/loadKernels.js';
import { loadKernels } from '../../src/kernel/loadKernels.js';
import { twinInstance } from '../../src/kernel/twins.js';
import type { ComplexMatrix } from '../../src/matrix/ComplexMatrix.js';
import { zeroMatrix } from '../../src/matrix/ComplexMatrix.js';
import { LAYOUTS, MIRRORS } from '../../src/mesh/Mesh.js';
import { randomStream } from '../../src/random/RandomStream.js';
import type { FieldSweep } from '../../src/simulate/createFieldSweep.js';
import { createFieldSweep, reserveFieldMemory } from '../../src/simulate/createFieldSweep.js';
import { simulate } from '../../src/simulate/simulate.js';
import { derivativesByElements } from '../support/elements.js';
import { maxDifference } from '../support/matrices.js';
import { ALL_STYLES, styleName } from '../support/styles.js';

const BOTH: readonly (readonly [name: string, make: () => KernelInstance])[] = [
  ['compiled kernels', () => loadKernels()],
  ['twins', () => twinInstance()],
];

/** A chip with splitters of all ratios and, when lossy, every kind of loss; facets differ from port to port. */
function roughChip(ideal: Chip, lossy: boolean, seed: number): Chip {
  const random = randomStream(seed, 904);
  const couplingRatios = ideal.couplingRatios.map(() => random.uniform());
  if (!lossy) return { ...ideal, couplingRatios };
  const { modes, cells } = ideal.mesh;
  const between = (low: number, count: number): Float64Array =>
    Float64Array.from({ length: count }, () => low + (1 - low) * random.uniform());
  return {
    ...ideal,
    couplingRatios,
    loss: {
      splitter: 0.97,
      shifter: 0.9,
      column: 0.95,
      input: between(0.5, modes),
      output: between(0.5, modes),
    },
    cellLoss: seed % 2 === 0 ? between(0.8, cells) : null,
  };
}

function randomPhases(chip: Chip, seed: number): Float64Array {
  const random = randomStream(seed, 905);
  return Float64Array.from({ length: shifterCount(chip) }, () => 13 * (random.uniform() - 0.5));
}

function randomSlope(rows: number, columns: number, seed: number): ComplexMatrix {
  const random = randomStream(seed, 906);
  const slope = zeroMatrix(rows, columns);
  for (let k = 0; k < slope.re.length; k++) [slope.re[k], slope.im[k]] = [random.normal(), random.normal()];
  return slope;
}

const all = (modes: number): number[] => Array.from({ length: modes }, (_, port) => port);

function columnsOf(matrix: ComplexMatrix, inputs: readonly number[]): ComplexMatrix {
  const chosen = zeroMatrix(matrix.rows, inputs.length);
  for (let row = 0; row < matrix.rows; row++) {
    inputs.forEach((input, k) => {
      chosen.re[row * inputs.length + k] = matrix.re[row * matrix.columns + input]!;
      chosen.im[row * inputs.length + k] = matrix.im[row * matrix.columns + input]!;
    });
  }
  return chosen;
}

/** Re Tr(G^dag A): what a cost with the derivatives G by V gains when V moves along A. */
function realOverlap(slope: ComplexMatrix, along: ComplexMatrix): number {
  return slope.re.reduce((sum, value, k) => sum + value * along.re[k]! + slope.im[k]! * along.im[k]!, 0);
}

function gradientOf(sweep: FieldSweep, phases: Float64Array, slope: ComplexMatrix): Float64Array {
  const gradient = new Float64Array(phases.length);
  sweep.forward(phases);
  sweep.backward(slope, gradient);
  return gradient;
}

describe.each(BOTH)('the field sweep on %s', (_name, make) => {
  it.each(ALL_STYLES.map((style) => [styleName(style), style] as const))(
    'has the gradient that products of elementary matrices have: %s',
    (_style, style) => {
      let seed = 1;
      for (const layout of LAYOUTS) {
        for (const mirror of MIRRORS) {
          for (const [lossy, portShifters] of [
            [false, true],
            [true, true],
            [true, false],
          ] as const) {
            const chip = roughChip(idealChip(4, { style, layout, mirror, portShifters }), lossy, ++seed);
            const phases = randomPhases(chip, seed);
            const slope = randomSlope(4, 4, seed);
            const sweep = createFieldSweep(chip, reserveFieldMemory(chip.mesh, all(4), make()));
            const { matrix, slopes } = derivativesByElements(chip, phases);
            expect(maxDifference(sweep.forward(phases), matrix)).toBeLessThan(1e-14);
            const gradient = gradientOf(sweep, phases, slope);
            // Each of some 60 elements adds roundings of eps; entries of G are about 1. 3e-15 was the most seen.
            slopes.forEach((along, k) =>
              expect(Math.abs(gradient[k]! - realOverlap(slope, along))).toBeLessThan(1e-13),
            );
          }
        }
      }
    },
  );

  it('does what the simulation does, at all sizes and for any choice of inputs', () => {
    for (const [modes, inputs] of [
      [1, [0]],
      [2, [1]],
      [3, all(3)],
      [8, all(8)],
      [9, all(9)],
      [12, [0, 5, 11]],
      [20, all(20)],
      [23, [3, 4, 5, 6, 7, 8, 9, 10, 11, 22]],
    ] as const) {
      for (const layout of LAYOUTS) {
        const chip = roughChip(idealChip(modes, { layout }), true, modes);
        const phases = randomPhases(chip, modes);
        const sweep = createFieldSweep(chip, reserveFieldMemory(chip.mesh, inputs, make()));
        const expected = columnsOf(simulate(chip, settingsFromPhases(chip, phases)), inputs);
        expect(maxDifference(sweep.forward(phases), expected)).toBeLessThan(1e-14);
      }
    }
  });

  // The gradient is the same whatever else is in the panel: that of all inputs is the sum of those of each.
  it('has a gradient that adds up over the inputs, fields kept or made anew', () => {
    for (const [modes, style] of [
      [11, ALL_STYLES[0]!],
      [18, ALL_STYLES[23]!],
    ] as const) {
      const chip = roughChip(idealChip(modes, { style }), true, modes);
      const phases = randomPhases(chip, modes);
      const slope = randomSlope(modes, modes, modes);
      const whole = [true, false].map((keeps) => {
        const memory = reserveFieldMemory(chip.mesh, all(modes), make(), keeps);
        return gradientOf(createFieldSweep(chip, memory), phases, slope);
      });
      expect(whole[0]).toEqual(whole[1]);
      const sum = new Float64Array(phases.length);
      for (let input = 0; input < modes; input++) {
        const sweep = createFieldSweep(chip, reserveFieldMemory(chip.mesh, [input], make()));
        gradientOf(sweep, phases, columnsOf(slope, [input])).forEach((value, k) => (sum[k]! += value));
      }
      sum.forEach((value, k) => expect(Math.abs(value - whole[0]![k]!)).toBeLessThan(1e-12));
    }
  });

  it('leaves alone what is not its own, and can be used again for another chip of the mesh', () => {
    const ideal = idealChip(10);
    const instance = make();
    const before = instance.reserve(16);
    const memory = reserveFieldMemory(ideal.mesh, [1, 2, 9], instance);
    const behind = instance.reserve(16);
    for (const address of [before, behind]) instance.doubles(address, 16).fill(-5);
    const slope = randomSlope(10, 3, 1);
    const results = [1, 2, 1].map((seed) => {
      const chip = roughChip(ideal, true, seed);
      return gradientOf(createFieldSweep(chip, memory), randomPhases(chip, seed), slope);
    });
    expect(results[2]).toEqual(results[0]);
    for (const address of [before, behind]) {
      expect(Array.from(instance.doubles(address, 16))).toEqual(new Array(16).fill(-5));
    }
  });

  it('refuses phases of another chip', () => {
    const chip = idealChip(3);
    const sweep = createFieldSweep(chip, reserveFieldMemory(chip.mesh, [0], make()));
    expect(() => sweep.forward(new Float64Array(8))).toThrow(RangeError);
  });
});

describe('both instances', () => {
  it('give the same bits', () => {
    for (const modes of [1, 2, 7, 16, 25]) {
      const chip = roughChip(idealChip(modes), true, modes);
      const [compiled, plain] = BOTH.map(([, make]) => {
        const sweep = createFieldSweep(chip, reserveFieldMemory(chip.mesh, all(modes), make()));
        return gradientOf(sweep, randomPhases(chip, 1), randomSlope(modes, modes, 2));
      });
      expect(compiled).toEqual(plain);
    }
  });
});

import { describe, expect, it } from 'vitest';
import { writeArms, writeSplitArms } from '../../src/chip/cellTransfer.js';
import type { Chip, PhaseRange } from '../../src/chip/Chip.js';
import { idealChip } from '../../src/chip/idealChip.js';
import type { Settings } from '../../src/chip/Settings.js';
import { zeroSettings } from '../../src/chip/shifters.js';
import type { ComplexMatrix } from '../../src/matrix/ComplexMatrix.js';
import { identityMatrix, matrixFromRows } from '../../src/matrix/ComplexMatrix.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import { innerProduct } from '../../src/matrix/products.js';
import { lapackResidual } from '../support/lapackResidual.js';
import { figuresOfMerit } from '../../src/merit/merit.js';
import { LAYOUTS, MIRRORS } from '../../src/mesh/Mesh.js';
import { programChip } from '../../src/program/programChip.js';
import { randomStream } from '../../src/random/RandomStream.js';
import { simulate } from '../../src/simulate/simulate.js';
import {
  blockDiagonal,
  dft,
  hadamard,
  maxDifference,
  nonlinearSignGate,
  permutation,
  reversal,
  unitaryMatrices,
  withNoise,
} from '../support/matrices.js';
import { ALL_STYLES, styleName, THREE_SPLITTER_STYLES, TWO_SPLITTER_STYLES } from '../support/styles.js';

const { PI } = Math;

function programmed(chip: Chip, target: ComplexMatrix): Settings {
  return programChip(chip, target).program.settings;
}

/** Expects phases in units of pi, compared on the circle, to 1e-9 or to the digits that the source gives. */
function expectPhases(found: ArrayLike<number>, inPi: readonly number[], within = 1e-9): void {
  expect(found).toHaveLength(inPi.length);
  Array.from(found).forEach((phase, k) => {
    const distance = Math.abs(Math.sin((phase - PI * inPi[k]!) / 2));
    expect(distance, `phase ${k + 1}: ${phase / PI} pi, not ${inPi[k]} pi`).toBeLessThan(within);
  });
}

/** Splitter ratios sin^2(pi/4 + error) with errors of the given spread, from a fixed stream. */
function scattered(chip: Chip, spread: number, seed: number): Chip {
  const random = randomStream(seed, 900);
  return {
    ...chip,
    couplingRatios: chip.couplingRatios.map(() => Math.sin(PI / 4 + spread * random.normal()) ** 2),
  };
}

// check-values section 5, convention A, phases in units of pi; derived there and checked to 1e-9.
describe('worked examples', () => {
  it.each([
    ['identity', identityMatrix(2), 1, 0, [1, 0]],
    ['swap', permutation([1, 0]), 0, 0, [1.5, 1.5]],
    ['Fourier and Hadamard', dft(2), 0.5, 0, [1.25, 1.25]],
    [
      'coupler',
      matrixFromRows([
        [Math.SQRT1_2, [0, Math.SQRT1_2]],
        [[0, Math.SQRT1_2], Math.SQRT1_2],
      ]),
      0.5,
      1.5,
      [1.75, 0.25],
    ],
    [
      'rotation by 60 degrees',
      matrixFromRows([
        [0.5, -Math.sqrt(3) / 2],
        [Math.sqrt(3) / 2, 0.5],
      ]),
      1 / 3,
      1,
      [1 / 3, 1 / 3],
    ],
  ] as const)('two ports: %s', (_name, target, theta, phi, port) => {
    for (const layout of LAYOUTS) {
      const settings = programmed(idealChip(2, { layout }), target);
      expectPhases(settings.internal, [theta]);
      expectPhases(settings.external, [phi]);
      expectPhases(settings.port!, port);
    }
  });

  it('Fourier transform of three ports, both layouts', () => {
    for (const layout of LAYOUTS) {
      const settings = programmed(idealChip(3, { layout }), dft(3));
      expectPhases(settings.internal, [0.5, 0.391826552, 0.5]);
      expectPhases(settings.external, [5 / 3, 23 / 12, 0.1125799427]);
      expectPhases(settings.port!, [0.554086724, 0.8874200573, 0.9707533907]);
    }
  });

  it('Fourier transform of four ports, triangular', () => {
    const settings = programmed(idealChip(4, { layout: 'triangular' }), dft(4));
    // Listed there in the order of the nulling; here by columns, where cells 3 and 4 change places.
    expectPhases(settings.internal, [0.5, 0.391826552, 0.5804306233, 1 / 3, 0.391826552, 0.5]);
    expectPhases(settings.external, [1.5, 1.75, 1.7983296584, 1.804086724, 0.0781216967, 0.126451355]);
    expectPhases(settings.port!, [1.8874200573, 0.3874200573, 0.6374200573, 0.8333333333]);
  });

  it('Fourier transform of four ports, rectangular', () => {
    const settings = programmed(idealChip(4), dft(4));
    expectPhases(settings.internal, [0.5, 0.5, 0.391826552, 1 / 3, 1 / 3, 0.608173448]);
    expectPhases(settings.external, [1.5, 0, 0.75, 0.945913276, 0.804086724, 0.804086724]);
    expectPhases(settings.port!, [1.8874200573, 0.5292466093, 0.7792466093, 0.8333333333]);
  });

  it('nonlinear-sign gate', () => {
    const settings = programmed(idealChip(3, { layout: 'triangular' }), nonlinearSignGate());
    expectPhases(settings.internal, [0.3415096345, 0.7343809802, 0.3415096345]);
    expectPhases(settings.external, [0, 0.3292451828, 0.1964356729]);
    // Eight digits are given for these.
    expectPhases(settings.port!, [0.46205469, 0.46205469, 0.13280951], (PI / 2) * 0.5e-8);
  });

  it('reversal of four ports, and one exchange among three', () => {
    const reversed = programmed(idealChip(4), reversal(4));
    expectPhases(reversed.internal, [0, 0, 0, 0, 0, 0]);
    expectPhases(reversed.port!, [0.5, 0.5, 0.5, 0.5]);
    const exchanged = programmed(idealChip(3, { layout: 'triangular' }), permutation([1, 0, 2]));
    expectPhases(exchanged.internal, [1, 1, 0]);
    expectPhases(exchanged.port!, [0.5, 0.5, 0]);
    const chip = idealChip(4, { layout: 'triangular' });
    expectPhases(programmed(chip, identityMatrix(4)).port!, [1, 0, 1, 0]);
  });

  it('one port to N with equal powers, down a chain of bar powers 1/(N-i+1)', () => {
    // The settings made by hand, the simulation checked: |out|^2 = 1/N.
    const chip = idealChip(4, { layout: 'triangular' });
    const powers: Readonly<Record<number, number>> = { 1: 1 / 4, 2: 1 / 3, 3: 1 / 2 };
    const internal = new Float64Array(6).fill(PI);
    for (let m = 1; m <= 3; m++) {
      const cell = chip.mesh.upperPortIndex.findIndex((port) => port === m - 1);
      internal[cell] = 2 * Math.asin(Math.sqrt(powers[m]!));
    }
    const { re, im } = simulate(chip, { internal, external: new Float64Array(6), port: new Float64Array(4) });
    for (let i = 0; i < 4; i++) expect(re[4 * i]! ** 2 + im[4 * i]! ** 2).toBeCloseTo(1 / 4, 14);
  });

  it('all cells at cross make i^(N-1) times the reversal, exactly', () => {
    for (const layout of LAYOUTS) {
      for (const modes of [2, 3, 4, 5, 6, 9]) {
        const chip = idealChip(modes, { layout });
        const zeros = programmed(chip, reversal(modes));
        zeros.port!.fill(0);
        const { re, im } = simulate(chip, zeros);
        const expected = [
          [1, 0],
          [0, 1],
          [-1, 0],
          [0, -1],
        ][(modes - 1) % 4]!;
        for (let j = 0; j < modes; j++) {
          const at = (modes - 1 - j) * modes + j;
          expect(re[at]).toBeCloseTo(expected[0]!, 14);
          expect(im[at]).toBeCloseTo(expected[1]!, 14);
        }
      }
    }
  });
});

describe.each(ALL_STYLES.map((style) => [styleName(style), style] as const))('cells: %s', (_name, style) => {
  it.each([1, 2, 3, 4, 7])('are programmed exactly on both layouts and all mirrors, N = %i', (modes) => {
    for (const layout of LAYOUTS) {
      for (const mirror of MIRRORS) {
        const chip = idealChip(modes, { layout, mirror, style });
        for (const [name, target] of unitaryMatrices(modes)) {
          const { settings, outOfReach, outOfRange } = programChip(chip, target).program;
          expect([outOfReach, outOfRange]).toEqual([[], []]);
          expect(
            lapackResidual(target, simulate(chip, settings)),
            `${name}, ${layout}, ${mirror}`,
          ).toBeLessThan(30);
        }
      }
    }
  });

  it('have internal phases in [0, pi], all others in [0, 2 pi)', () => {
    const { internal, external, port } = programmed(idealChip(9, { style }), haarUnitary(9, 8));
    for (const theta of internal) expect(theta >= 0 && theta <= PI).toBe(true);
    for (const phase of [...external, ...port!]) expect(phase >= 0 && phase < 2 * PI).toBe(true);
  });

  // Bandyopadhyay, Hamerly, Englund, Optica 8, 1247 (2021): exact whenever no cell is out of reach.
  it('correct measured splitters exactly while every cell is in reach', () => {
    let exact = 0;
    for (let seed = 1; seed <= 12; seed++) {
      for (const layout of LAYOUTS) {
        const chip = scattered(idealChip(5, { style, layout, mirror: MIRRORS[seed % 4]! }), 0.05, seed);
        const target = haarUnitary(5, 100 + seed);
        const { program, uncorrected } = programChip(chip, target);
        const achieved = simulate(chip, program.settings);
        if (program.outOfReach.length === 0) {
          exact++;
          expect(maxDifference(target, achieved)).toBeLessThan(1e-12);
        } else {
          expect(maxDifference(target, achieved)).toBeGreaterThan(1e-6);
        }
        const without = figuresOfMerit(target, simulate(chip, uncorrected!.settings)).fidelity;
        expect(figuresOfMerit(target, achieved).fidelity).toBeGreaterThan(without);
      }
    }
    expect(exact).toBeGreaterThan(6);
  });

  it('keep to a range by the second branch and whole turns, exactly', () => {
    for (const range of [
      [1, 1 + 2 * PI],
      [-PI, PI],
      [2 * PI, 4 * PI],
      [-7, -7 + 2 * PI],
    ] as const satisfies readonly PhaseRange[]) {
      const chip = { ...idealChip(5, { style }), shifterRange: range };
      const target = haarUnitary(5, 3);
      const { settings, outOfRange } = programChip(chip, target).program;
      expect(outOfRange).toEqual([]);
      for (const phase of [...settings.internal, ...settings.external, ...settings.port!]) {
        expect(phase).toBeGreaterThanOrEqual(range[0]);
        expect(phase).toBeLessThanOrEqual(range[1]);
      }
      expect(maxDifference(target, simulate(chip, settings))).toBeLessThan(1e-13);
    }
  });

  it('carry on the best port phases when a phase must be clamped', () => {
    // One cell, so that the port phases are all that may still be chosen: no choice may do better than what
    // is set.
    const chip = { ...idealChip(2, { style }), shifterRanges: new Map<number, PhaseRange>() };
    const free = programChip(chip, haarUnitary(2, 9)).program.settings;
    const ownRanges = new Map<number, PhaseRange>();
    const first = style.external.endsWith('output') ? 2 : 0;
    for (const shifter of [first, first + 1])
      ownRanges.set(shifter, [0, 0.4 * Math.min(free.internal[0]!, free.external[0]!)]);
    const limited = { ...chip, shifterRanges: ownRanges };
    const target = haarUnitary(2, 9);
    const { settings, outOfRange } = programChip(limited, target).program;
    expect(outOfRange.map(({ shifterIndex }) => shifterIndex)).toContain(
      style.external.endsWith('output') ? first : first + 1,
    );
    const overlap = (port: Float64Array): number =>
      Math.hypot(...innerProduct(target, simulate(limited, { ...settings, port })));
    const best = overlap(settings.port!);
    for (let k = 0; k < 64; k++) {
      const turned = Float64Array.of(settings.port![0]!, settings.port![1]! + (k / 32) * PI);
      expect(overlap(turned)).toBeLessThanOrEqual(best + 1e-12);
    }
  });
});

// With a third splitter what is wanted of the other two depends on the phases that are carried.
describe.each(TWO_SPLITTER_STYLES.map((style) => [styleName(style), style] as const))(
  'cells of two splitters: %s',
  (_name, style) => {
    it('have the same bar power in every style, target by target', () => {
      const barPowers = (of: typeof style): number[] => {
        const { internal } = programmed(
          idealChip(5, { style: of, layout: 'triangular' }),
          haarUnitary(5, 77),
        );
        const arms = new Float64Array(4);
        const transfer = new Float64Array(8);
        return Array.from(internal, (theta) => {
          writeArms(arms, of.internal, theta, 1);
          writeSplitArms(transfer, of.splitterForm, 0.5, 0.5, arms);
          return transfer[0]! ** 2 + transfer[1]! ** 2;
        });
      };
      const reference = barPowers(ALL_STYLES[0]!);
      barPowers(style).forEach((power, k) => expect(power).toBeCloseTo(reference[k]!, 12));
    });

    it('set bar and cross with phase 0 where zero is meant', () => {
      const bar = style.splitterForm === 'real' ? 0 : PI;
      for (const layout of LAYOUTS) {
        const identity = programmed(idealChip(6, { style, layout }), withNoise(identityMatrix(6)));
        expect(Array.from(identity.internal)).toEqual(Array.from(identity.internal, () => bar));
        expect(Array.from(identity.external)).toEqual(Array.from(identity.external, () => 0));
        const reversed = programmed(idealChip(6, { style, layout }), withNoise(reversal(6)));
        expect(Array.from(reversed.internal)).toEqual(Array.from(reversed.internal, () => PI - bar));
        expect(Array.from(reversed.external)).toEqual(Array.from(reversed.external, () => 0));
      }
    });
  },
);

describe.each(THREE_SPLITTER_STYLES.map((style) => [styleName(style), style] as const))(
  'cells of three splitters: %s',
  (_name, style) => {
    // Such a target asks for a full bar or cross state of the two splitters around the arms, which comes about by
    // cancellation only: T(theta, 0) S(c), with the phases of ports before and behind.
    it('set bar and cross of the two around the arms with phase 0 where zero is meant', () => {
      const chip = idealChip(2, { style });
      for (const internal of [0, PI]) {
        for (const port of [0, 0.3]) {
          const settings = zeroSettings(chip);
          settings.internal[0] = internal;
          settings.port!.set([port, port + 1]);
          const found = programmed(chip, withNoise(simulate(chip, settings)));
          expect(found.internal[0]).toBe(internal);
          expect(found.external[0]).toBe(0);
        }
      }
    });

    // Hamerly, Bandyopadhyay, Englund, Nat. Commun. 13, 6831 (2022): the perfect cross state can be reached, and
    // so can the bar state; what is out of reach lies on |s| = 1, where equal powers stay and cross.
    it('do cross and bar states with splitters of any ratio near 1/2', () => {
      for (let seed = 0; seed < 20; seed++) {
        const layout = LAYOUTS[seed % 2]!;
        const ideal = idealChip(7, { style, layout, mirror: MIRRORS[(seed >> 1) % 4]! });
        const all = { ...ideal, couplingRatios: ideal.couplingRatios.map(() => 0.45) };
        for (const chip of [scattered(ideal, 0.05, seed), all]) {
          for (const target of [identityMatrix(7), reversal(7), permutation([1, 2, 3, 4, 5, 6, 0])]) {
            const { settings, outOfReach } = programChip(chip, target).program;
            expect(outOfReach).toEqual([]);
            expect(maxDifference(target, simulate(chip, settings))).toBeLessThan(1e-12);
          }
        }
      }
    });
  },
);

describe('reach', () => {
  const cell = (alpha: number, beta: number): Chip => ({
    ...idealChip(2),
    couplingRatios: Float64Array.of(Math.sin(PI / 4 + alpha) ** 2, Math.sin(PI / 4 + beta) ** 2),
  });
  /** A target of bar power sin^2(half). */
  const barPower = (half: number): ComplexMatrix =>
    matrixFromRows([
      [Math.sin(half), -Math.cos(half)],
      [Math.cos(half), Math.sin(half)],
    ]);

  // check-values section 2: attainable half-angles are |alpha + beta| to pi/2 - |alpha - beta|.
  it('ends exactly at |alpha + beta| and pi/2 - |alpha - beta|', () => {
    const [alpha, beta] = [0.06, -0.02];
    const chip = cell(alpha, beta);
    for (const [half, inReach] of [
      [0.04 + 1e-6, true],
      [0.04 - 1e-6, false],
      [PI / 2 - 0.08 - 1e-6, true],
      [PI / 2 - 0.08 + 1e-6, false],
    ] as const) {
      const target = barPower(half);
      const { settings, outOfReach } = programChip(chip, target).program;
      expect(outOfReach).toHaveLength(inReach ? 0 : 1);
      const difference = maxDifference(target, simulate(chip, settings));
      if (inReach) expect(difference).toBeLessThan(1e-12);
      else expect(difference).toBeGreaterThan(1e-7);
    }
  });

  it('is reported with what was wanted, and the nearest end is set', () => {
    const chip = cell(0.06, -0.02);
    const { settings, outOfReach } = programChip(chip, permutation([1, 0])).program;
    expect(outOfReach).toEqual([
      {
        cellIndex: 0,
        wanted: 0,
        low: expect.closeTo(Math.sin(0.04) ** 2, 14) as number,
        high: expect.closeTo(Math.cos(0.08) ** 2, 14) as number,
      },
    ]);
    expect(settings.internal[0]).toBe(0);
    expect(figuresOfMerit(permutation([1, 0]), simulate(chip, settings)).fidelity).toBeCloseTo(
      Math.cos(0.04) ** 2,
      13,
    );
    const other = programChip(chip, identityMatrix(2)).program;
    expect(other.settings.internal[0]).toBeCloseTo(PI, 14);
    expect(figuresOfMerit(identityMatrix(2), simulate(chip, other.settings)).fidelity).toBeCloseTo(
      Math.cos(0.08) ** 2,
      13,
    );
  });

  it('of a splitter of ratio 0 or 1 leaves no choice: theta is 0', () => {
    for (const ratios of [
      [0, 0.5],
      [1, 0.5],
      [0.3, 1],
      [0, 0],
      [1, 1],
      [0, 1],
    ]) {
      for (const style of ALL_STYLES) {
        const atOutput = style.external.endsWith('output');
        const ofCell = style.splitters === 2 ? ratios : atOutput ? [...ratios, 0.4] : [0.4, ...ratios];
        const chip = { ...idealChip(2, { style }), couplingRatios: Float64Array.from(ofCell) };
        const target = haarUnitary(2, 5);
        const { settings, outOfReach } = programChip(chip, target).program;
        expect(settings.internal[0]).toBe(0);
        expect(outOfReach).toHaveLength(1);
        for (const phase of [settings.external[0], ...settings.port!]) expect(phase).not.toBeNaN();
      }
    }
  });
});

describe('port shifters', () => {
  it('may be missing: the rest is as before, and the port-phase-free fidelity is 1', () => {
    for (const style of ALL_STYLES) {
      const target = haarUnitary(4, 6);
      const whole = programmed(idealChip(4, { style }), target);
      const chip = idealChip(4, { style, portShifters: false });
      const settings = programmed(chip, target);
      expect(settings.port).toBeNull();
      expect(settings.internal).toEqual(whole.internal);
      expect(settings.external).toEqual(whole.external);
      const side = style.external.endsWith('output') ? 'input' : 'output';
      const merit = figuresOfMerit(target, simulate(chip, settings), side);
      expect(merit.portPhaseFreeFidelity).toBeCloseTo(1, 13);
      expect(merit.fidelity).toBeLessThan(0.99);
    }
  });

  it('are clamped to the end of their range that is nearest on the circle', () => {
    const chip: Chip = { ...idealChip(4), shifterRanges: new Map([[12, [0, 1] as const]]) };
    // Wanted 1.887 pi (check-values section 5): nearer to 0 than to 1.
    const { settings, outOfRange } = programChip(chip, dft(4)).program;
    expect(settings.port![0]).toBe(0);
    expect(outOfRange).toEqual([
      { shifterIndex: 12, wantedRad: expect.closeTo(1.8874200573 * PI, 8) as number, setRad: 0 },
    ]);
  });
});

it('programs real, sparse and block-diagonal targets without noise in their phases', () => {
  // A differential pair adds no common phase, so a real matrix needs multiples of pi/2 alone.
  const style = {
    internal: 'differential',
    external: 'upper-input',
    splitterForm: 'symmetric',
    splitters: 2,
  } as const;
  const quarter = (phase: number): number => Math.abs(Math.sin(2 * phase));
  for (const layout of LAYOUTS) {
    for (const target of [hadamard(8), blockDiagonal(hadamard(2), hadamard(4)), permutation([2, 0, 3, 1])]) {
      const { external, port } = programmed(idealChip(target.rows, { layout, style }), target);
      for (const phase of [...external, ...port!]) expect(quarter(phase)).toBeLessThan(1e-13);
    }
  }
});

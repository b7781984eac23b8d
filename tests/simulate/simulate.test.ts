import { describe, expect, it } from 'vitest';
import type { Chip, ChipLoss } from '../../src/chip/Chip.js';
import { idealChip } from '../../src/chip/idealChip.js';
import { listShifters, phaseOf, zeroSettings } from '../../src/chip/shifters.js';
import type { ComplexMatrix } from '../../src/matrix/ComplexMatrix.js';
import { identityMatrix } from '../../src/matrix/ComplexMatrix.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import { unitarityDefect } from '../../src/matrix/norms.js';
import { multiply } from '../../src/matrix/products.js';
import { figuresOfMerit } from '../../src/merit/merit.js';
import type { Layout } from '../../src/mesh/Mesh.js';
import { LAYOUTS, MIRRORS } from '../../src/mesh/Mesh.js';
import { programChip } from '../../src/program/programChip.js';
import { randomStream } from '../../src/random/RandomStream.js';
import { simulate } from '../../src/simulate/simulate.js';
import { innerAndOuter } from '../support/elements.js';
import { dft, maxDifference } from '../support/matrices.js';
import { ALL_STYLES } from '../support/styles.js';

function withLoss(chip: Chip, loss: Partial<ChipLoss>): Chip {
  return { ...chip, loss: { ...chip.loss, ...loss } };
}

const amplitude = (lossDb: number): number => 10 ** (-lossDb / 20);

/**
 * The chip as the product of one N x N matrix per element that the light meets, each written from conventions
 * sections 2 and 3.
 */
function elementByElement(chip: Chip, settings: ReturnType<typeof zeroSettings>): ComplexMatrix {
  const { modes } = chip.mesh;
  const { loss, style } = chip;
  let light = identityMatrix(modes);
  const pass = (change: (element: ComplexMatrix) => void): void => {
    const element = identityMatrix(modes);
    change(element);
    light = multiply(element, light);
  };
  const shifter = (port: number, phase: number): void =>
    pass(({ re, im }) => {
      re[port * modes + port] = loss.shifter * Math.cos(phase);
      im[port * modes + port] = loss.shifter * Math.sin(phase);
    });
  const splitter = (upper: number, ratio: number): void =>
    pass(({ re, im }) => {
      const c = loss.splitter * Math.sqrt(1 - ratio);
      const s = loss.splitter * Math.sqrt(ratio);
      const [a, b] = [upper * modes + upper, upper * modes + upper + 1];
      const [d, e] = [a + modes, b + modes];
      if (style.splitterForm === 'symmetric') {
        [re[a], im[b], im[d], re[e]] = [c, s, s, c];
      } else {
        [re[a], re[b], re[d], re[e]] = [c, s, s, -c];
      }
    });
  const facets = (amplitudes: Float64Array): void =>
    pass(({ re }) => amplitudes.forEach((value, port) => (re[port * modes + port] = value)));
  const shifters = listShifters(chip);
  facets(loss.input);
  for (const one of shifters.filter(({ role }) => role === 'input')) {
    shifter(one.portIndex, phaseOf(settings, one));
  }
  for (let cell = 0; cell < chip.mesh.cells; cell++) {
    const upper = chip.mesh.upperPortIndex[cell]!;
    const [external, internal] = ['external', 'internal'].map((role) =>
      shifters.find((one) => one.cellIndex === cell && one.role === role)!,
    );
    const [ratios, outer] = innerAndOuter(chip, cell);
    if (style.external.endsWith('input')) {
      if (outer !== undefined) splitter(upper, outer);
      shifter(external!.portIndex, phaseOf(settings, external!));
    }
    splitter(upper, ratios[0]!);
    const theta = phaseOf(settings, internal!);
    if (style.internal === 'differential') {
      shifter(upper, theta / 2);
      shifter(upper + 1, -theta / 2);
    } else shifter(internal!.portIndex, theta);
    splitter(upper, ratios[1]!);
    if (style.external.endsWith('output')) {
      shifter(external!.portIndex, phaseOf(settings, external!));
      if (outer !== undefined) splitter(upper, outer);
    }
  }
  for (const one of shifters.filter(({ role }) => role === 'output')) {
    shifter(one.portIndex, phaseOf(settings, one));
  }
  for (let column = 0; column < chip.mesh.columns; column++) {
    pass(({ re }) => {
      for (let port = 0; port < modes; port++) re[port * modes + port] = loss.column;
    });
  }
  facets(loss.output);
  return light;
}

describe('the transfer matrix', () => {
  it('is the product of all elements, in every style, with every kind of loss', () => {
    const random = randomStream(4, 901);
    for (const style of ALL_STYLES) {
      for (const [layout, mirror, portShifters] of [
        ['rectangular', 'none', true],
        ['triangular', 'ports', true],
        ['rectangular', 'both', false],
      ] as const) {
        const ideal = idealChip(4, { style, layout, mirror, portShifters });
        const chip: Chip = {
          ...ideal,
          couplingRatios: ideal.couplingRatios.map(() => random.uniform()),
          loss: {
            splitter: 0.97,
            shifter: 0.9,
            column: 0.95,
            input: Float64Array.of(1, 0.8, 0.7, 0.9),
            output: Float64Array.of(0.6, 1, 0.5, 0.8),
          },
        };
        const settings = zeroSettings(chip);
        for (const phases of [settings.external, settings.internal, settings.port ?? []]) {
          for (let k = 0; k < phases.length; k++) phases[k] = 13 * (random.uniform() - 0.5);
        }
        const difference = maxDifference(simulate(chip, settings), elementByElement(chip, settings));
        expect(difference).toBeLessThan(1e-15 * 8);
      }
    }
  });

  it('is unitary without loss, whatever the phases and ratios: the commutators of all ports hold', () => {
    const random = randomStream(5, 901);
    for (const layout of LAYOUTS) {
      for (const mirror of MIRRORS) {
        const ideal = idealChip(7, { layout, mirror });
        const chip = { ...ideal, couplingRatios: ideal.couplingRatios.map(() => random.uniform()) };
        const settings = zeroSettings(chip);
        settings.internal.forEach((_, k) => (settings.internal[k] = 9 * random.uniform()));
        settings.external.forEach((_, k) => (settings.external[k] = 9 * random.uniform()));
        expect(unitarityDefect(simulate(chip, settings))).toBeLessThan(1e-14);
      }
    }
  });

  it('refuses settings of another shape', () => {
    expect(() => simulate(idealChip(4), zeroSettings(idealChip(3)))).toThrow(RangeError);
    expect(() => simulate(idealChip(4), zeroSettings(idealChip(4, { portShifters: false })))).toThrow(
      RangeError,
    );
  });
});

describe('loss', () => {
  it('in columns or equal facets scales the whole matrix and never changes the fidelity', () => {
    const target = haarUnitary(5, 2);
    const chip = idealChip(5, { layout: 'triangular' });
    const { settings } = programChip(chip, target).program;
    const lossy = withLoss(chip, { column: amplitude(0.3), input: new Float64Array(5).fill(amplitude(1)) });
    const merit = figuresOfMerit(target, simulate(lossy, settings));
    expect(merit.fidelity).toBeCloseTo(1, 14);
    // Seven columns of 0.3 dB and a facet of 1 dB.
    expect(merit.transmissionDb).toBeCloseTo(-3.1, 12);
  });

  // check-values section 5: 0.5 dB a cell, DFT3, bypasses without loss: F = 0.9992634228.
  it('of 0.5 dB a cell leaves the fidelity of the three-port Fourier transform that is published with it', () => {
    const chip = withLoss(idealChip(3), { splitter: amplitude(0.25) });
    const { settings } = programChip(chip, dft(3)).program;
    expect(figuresOfMerit(dft(3), simulate(chip, settings)).fidelity).toBeCloseTo(0.9992634228, 9);
  });

  // check-values section 1: mean 1-F over Haar targets, equal loss per cell, to 10 % with 500 of them.
  it.each([
    [4, 0.2, 'triangular', 3.8e-4],
    [4, 0.2, 'rectangular', 1.7e-4],
    [8, 0.5, 'triangular', 1.9e-2],
    [8, 0.5, 'rectangular', 2.7e-3],
    [20, 0.1, 'triangular', 6.8e-3],
    [20, 0.1, 'rectangular', 2.0e-4],
    [20, 0.5, 'triangular', 0.158],
    [20, 0.5, 'rectangular', 5.4e-3],
    [20, 1.0, 'triangular', 0.461],
    [20, 1.0, 'rectangular', 2.4e-2],
  ] as const)('costs more in a triangle: N = %i, %d dB a cell, %s', (modes, lossDb, layout: Layout, mean) => {
    const chip = withLoss(idealChip(modes, { layout }), { splitter: amplitude(lossDb / 2) });
    const samples = 500;
    let sum = 0;
    for (let k = 0; k < samples; k++) {
      const target = haarUnitary(modes, 30_000 + k);
      sum += 1 - figuresOfMeritFast(target, simulate(chip, programChip(chip, target).program.settings));
    }
    expect(sum / samples / mean).toBeGreaterThan(0.9);
    expect(sum / samples / mean).toBeLessThan(1.1);
  });
});

/** F = abs(Tr(U^dag V))^2 / (N Tr(V^dag V)), written out: all that the loss study needs. */
function figuresOfMeritFast(target: ComplexMatrix, achieved: ComplexMatrix): number {
  let [re, im, power] = [0, 0, 0];
  for (let k = 0; k < target.re.length; k++) {
    const [ur, ui, vr, vi] = [target.re[k]!, target.im[k]!, achieved.re[k]!, achieved.im[k]!];
    re += ur * vr + ui * vi;
    im += ur * vi - ui * vr;
    power += vr * vr + vi * vi;
  }
  return (re * re + im * im) / (target.rows * power);
}

// check-values section 5: fidelity with all splitters off by alpha = 0.05, beta = +-0.05, phases of the ideal
// chip.
describe('splitter errors', () => {
  it.each([
    [2, 0.05, 0.9950104049],
    [2, -0.05, 0.9950104049],
    [3, 0.05, 0.9901756563],
    [3, -0.05, 0.9902333889],
  ] as const)('Fourier transform of %i ports, beta = %d', (modes, beta, fidelity) => {
    for (const layout of LAYOUTS) {
      const ideal = idealChip(modes, { layout });
      const ratio = (error: number): number => Math.sin(Math.PI / 4 + error) ** 2;
      const couplingRatios = ideal.couplingRatios.map((_, k) => ratio(k % 2 === 0 ? 0.05 : beta));
      const chip = { ...ideal, couplingRatios };
      const { program, uncorrected } = programChip(chip, dft(modes));
      expect(figuresOfMerit(dft(modes), simulate(chip, uncorrected!.settings)).fidelity).toBeCloseTo(
        fidelity,
        9,
      );
      // The same source: the local correction of these chips is exact.
      expect(maxDifference(dft(modes), simulate(chip, program.settings))).toBeLessThan(1e-12);
    }
  });
});

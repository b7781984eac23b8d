import { describe, expect, it } from 'vitest';
import type { Chip, ProcessErrors } from '../../src/chip/Chip.js';
import { NO_ERRORS } from '../../src/chip/Chip.js';
import { idealChip } from '../../src/chip/idealChip.js';
import { loadKernels } from '../../src/kernel/loadKernels.js';
import { twinInstance } from '../../src/kernel/twins.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import { figuresOfMerit } from '../../src/merit/merit.js';
import { freePorts } from '../../src/merit/portPhaseFree.js';
import { LAYOUTS, MIRRORS } from '../../src/mesh/Mesh.js';
import { simulate } from '../../src/simulate/simulate.js';
import { createTrialEngine } from '../../src/tolerance/createTrialEngine.js';
import type { TrialPlan } from '../../src/tolerance/TrialPlan.js';
import { ALL_STYLES, styleName } from '../support/styles.js';

const SIZES = [1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 15, 16, 17, 23, 32, 33, 40, 63, 64];
const FIGURES = [
  'fidelity',
  'averageGateFidelity',
  'portPhaseFreeFidelity',
  'rmsError',
  'transmission',
  'transmissionDb',
] as const;

/** Error sources in turn: all together, large ones that clamp, correlated ones, uniform ones, none. */
const PROCESSES: readonly Partial<ProcessErrors>[] = [
  { sigma: 0.03, sigmaAngle: 0.02, bias: 0.01, biasSigma: 0.02, phaseSigma: 0.03, lossSigmaDb: 0.1 },
  { sigma: 0.6, sigmaAngle: 1.5, phaseSigma: 4 },
  { sigma: 0.05, pairCorrelation: -0.4, correlationLength: 2.5 },
  { sigma: 0.04, sigmaAngle: 0.03, phaseSigma: 0.02, lossSigmaDb: 0.2, distribution: 'uniform' },
  {},
];

function lossyChip(chip: Chip): Chip {
  const { modes, cells } = chip.mesh;
  const ports = (offset: number): Float64Array =>
    Float64Array.from({ length: modes }, (_, k) => 0.8 + 0.1 * Math.sin(offset + k));
  return {
    ...chip,
    couplingRatios: chip.couplingRatios.map((_, k) => 0.5 + 0.05 * Math.sin(7 * k)),
    loss: { splitter: 0.99, shifter: 0.985, column: 0.97, input: ports(1), output: ports(2) },
    cellLoss: Float64Array.from({ length: cells }, (_, k) => 0.95 + 0.04 * Math.sin(3 * k)),
  };
}

interface Case {
  readonly name: string;
  readonly plan: TrialPlan;
}

/**
 * For each size several plans, so that layouts, mirrors, styles, losses, sources and ways to program go
 * round.
 */
function casesOf(modes: number): Case[] {
  return Array.from({ length: modes < 20 ? 6 : 2 }, (_, round) => {
    const turn = 5 * modes + round;
    const style = ALL_STYLES[(7 * turn) % ALL_STYLES.length]!;
    const layout = LAYOUTS[turn % 2]!;
    const mirror = MIRRORS[(turn >> 1) % 4]!;
    const portShifters = turn % 3 > 0;
    const ideal = idealChip(modes, { layout, mirror, style, portShifters });
    const process = PROCESSES[(turn + modes) % PROCESSES.length]!;
    const errors = { ...NO_ERRORS, ...process, bits: round % 3 === 2 ? 7 : 0 };
    const target = round % 4 === 1 ? 'haar' : haarUnitary(modes, turn);
    const chip = round % 2 === 0 ? lossyChip(ideal) : ideal;
    // With free inputs the port-phase-free fidelity is judged the long way, all other figures by the kernels:
    // both in turn.
    const figures = turn % 2 === 0 ? FIGURES : FIGURES.filter((key) => key !== 'portPhaseFreeFidelity');
    // With a resolution, cells are programmed by the readable sweep, so that no kernel without a twin is
    // called.
    const retune = errors.bits > 0 ? 'cell' : 'none';
    const plan = { chip, target, errors, retune, seed: 2 ** 40 + turn, figures } as const;
    const name = `${layout}, ${mirror}, ${styleName(style)}, ${JSON.stringify(errors)}, ${retune}`;
    return { name, plan };
  });
}

/** Bit patterns, so that -0 and NaN count as what they are. */
const bytesOf = (rows: Float64Array): Uint8Array => new Uint8Array(rows.buffer);

describe.each(SIZES)('trials with N = %i', (modes) => {
  const trials = modes < 20 ? 5 : 3;

  it('are the same bits on the compiled kernels and on their twins', () => {
    for (const { name, plan } of casesOf(modes)) {
      const [compiled, plain] = [loadKernels(), twinInstance()].map((instance) => {
        const rows = new Float64Array(trials * plan.figures.length);
        const start = instance.reserveBytes(64);
        const clamped = createTrialEngine(plan, instance).run(3, trials, rows);
        const end = instance.reserveBytes(64);
        return { rows: bytesOf(rows), clamped, memory: instance.bytes(start, end - start) };
      });
      expect(plain!.rows, name).toEqual(compiled!.rows);
      expect(plain!.clamped, name).toBe(compiled!.clamped);
      // Everything between, from random numbers to sums; compared as a whole, since a list of differences
      // would be endless.
      expect(Buffer.compare(plain!.memory, compiled!.memory), name).toBe(0);
    }
  });

  // Another way to the same figures: the sampled chip through the readable simulation and the figures of
  // merit. The kernels multiply factors of guides into one another where simulate() multiplies cells; what is
  // left is rounding: at most 4 N eps over all cases (10 times that for a transmission in dB). Only a ratio within
  // 1e-4 of 1 would exceed the bound: it holds cos a = sqrt(1 - ratio) no better than eps / cos a.
  it('agree with the simulation of the sampled chip', () => {
    for (const { name, plan } of casesOf(modes)) {
      const engine = createTrialEngine(plan);
      const rows = new Float64Array(trials * plan.figures.length);
      engine.run(3, trials, rows);
      for (let trial = 0; trial < trials; trial++) {
        const { chip, settings, target } = engine.sample(3 + trial);
        const merit = figuresOfMerit(target, simulate(chip, settings), freePorts(chip));
        plan.figures.forEach((key, k) => {
          const found = rows[trial * plan.figures.length + k]!;
          // The square of an error that is a difference of numbers near 1 is as accurate as they are.
          const [a, b] = key === 'rmsError' ? [found ** 2, merit[key] ** 2] : [found, merit[key]];
          const scale = key === 'transmissionDb' ? 10 : 1;
          const error = Math.abs(a - b) / (scale * modes * Number.EPSILON);
          expect(error, `${key} of trial ${trial}: ${a} and ${b}; ${name}`).toBeLessThan(16);
        });
      }
    }
  });
});

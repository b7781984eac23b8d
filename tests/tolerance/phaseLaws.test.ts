import { describe, expect, it } from 'vitest';
import type { CellStyle } from '../../src/chip/Chip.js';
import { idealChip } from '../../src/chip/idealChip.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import { LAYOUTS } from '../../src/mesh/Mesh.js';
import { programChip } from '../../src/program/programChip.js';
import { simulate } from '../../src/simulate/simulate.js';
import { ALL_STYLES, styleName } from '../support/styles.js';
import { infidelities, planFor } from './trialPlans.js';

// Laws of small phase errors (check-values, section 2, derived and checked against an independent program). A
// shifter on one guide has the generator |m><m|: an error of variance s^2 costs s^2 (1/N - 1/N^2).
// Comparisons allow 4 standard errors and the next order, L^2.

const MODES = 8;
const SIGMA = 0.02;

/**
 * A differential pair has the generator (|1><1| - |2><2|)/2, without trace: s^2/(2N) each, where a single arm
 * costs s^2 (N - 1)/N^2.
 */
function lawFor({ internal }: CellStyle): number {
  const single = SIGMA ** 2 * (1 / MODES - 1 / MODES ** 2);
  const cells = (MODES * (MODES - 1)) / 2;
  const internalCost = internal === 'differential' ? SIGMA ** 2 / (2 * MODES) : single;
  return cells * (internalCost + single) + MODES * single;
}

describe('phase errors', () => {
  it('cost (N - 1) s^2 on all N^2 single-arm phases', () => {
    expect(
      lawFor({ internal: 'upper', external: 'upper-input', splitterForm: 'real', splitters: 2 }),
    ).toBeCloseTo((MODES - 1) * SIGMA ** 2, 15);
  });

  it.each(ALL_STYLES.map((style, index) => [styleName(style), style, LAYOUTS[index % 2]!] as const))(
    'cost what their generators say: %s',
    (_, style, layout) => {
      const plan = planFor(MODES, { phaseSigma: SIGMA }, {}, { style, layout });
      const { mean, standardError } = infidelities(plan, 8000);
      const law = lawFor(style);
      expect(Math.abs(mean - law)).toBeLessThan(4 * standardError + law ** 2);
    },
  );

  // On theta and phi only: (N - 1)^2 s^2/N. The target is what the mesh does without port phases.
  it.each(LAYOUTS)('cost (N - 1)^2 s^2/N on a chip without port shifters, %s', (layout) => {
    const chip = idealChip(MODES, { layout, portShifters: false });
    const { settings } = programChip(chip, haarUnitary(MODES, 9)).program;
    const target = simulate(chip, settings);
    const { mean, standardError } = infidelities(
      planFor(MODES, { phaseSigma: SIGMA }, { chip, target }),
      20_000,
    );
    const law = ((MODES - 1) ** 2 * SIGMA ** 2) / MODES;
    expect(Math.abs(mean - law)).toBeLessThan(4 * standardError + law ** 2);
  });
});

describe('phases of so many bits', () => {
  // Rounding to 2^b steps of a turn is an error uniform within a step: (N - 1) (2 pi)^2/(12 4^b).
  it.each([
    [6, 5.62e-3],
    [8, 3.51e-4],
    [10, 2.196e-5],
  ])('%i bits cost %f at N = 8', (bits, published) => {
    const law = ((MODES - 1) * (2 * Math.PI) ** 2) / (12 * 4 ** bits);
    expect(Math.abs(law / published - 1)).toBeLessThan(0.002);
    for (const layout of LAYOUTS) {
      const plan = planFor(MODES, { bits }, { target: 'haar' }, { layout });
      const { mean, standardError } = infidelities(plan, 4000);
      expect(Math.abs(mean - law), layout).toBeLessThan(4 * standardError + law ** 2);
    }
  });
});

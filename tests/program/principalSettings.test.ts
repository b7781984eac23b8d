import { expect, it } from 'vitest';
import { idealChip } from '../../src/chip/idealChip.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import { LAYOUTS } from '../../src/mesh/Mesh.js';
import { principalSettings } from '../../src/program/principalSettings.js';
import { programChip } from '../../src/program/programChip.js';
import { simulate } from '../../src/simulate/simulate.js';
import { maxDifference } from '../support/matrices.js';
import { ALL_STYLES, styleName } from '../support/styles.js';

// 2 pi - theta is an equally exact second branch (conventions, section 5): whatever internal phases a chip is set
// to, others in [0, pi] do the same, splitters off 50:50 included.
it.each(
  ALL_STYLES.filter(({ splitters }) => splitters === 2).map((style) => [styleName(style), style] as const),
)('bring internal phases to [0, pi] without a change of the light, %s', (_, style) => {
  for (const layout of LAYOUTS) {
    const ideal = idealChip(6, { layout, style });
    const couplingRatios = ideal.couplingRatios.map((_, k) => 0.5 + 0.1 * Math.sin(3 * k));
    const chip = { ...ideal, couplingRatios };
    const { settings } = programChip(chip, haarUnitary(6, 9)).program;
    const wild = {
      ...settings,
      internal: settings.internal.map((theta, k) => (k % 2 === 0 ? 2 * Math.PI - theta : theta + 0.3 * k)),
    };
    const calm = principalSettings(chip, wild);
    // 16 N eps; 0.7 N eps was the most seen.
    expect(maxDifference(simulate(chip, calm), simulate(chip, wild))).toBeLessThan(16 * 6 * Number.EPSILON);
    for (const theta of calm.internal) expect(theta >= 0 && theta <= Math.PI).toBe(true);
    for (const phase of [...calm.external, ...calm.port!]) {
      expect(phase >= 0 && phase < 2 * Math.PI).toBe(true);
    }
  }
});

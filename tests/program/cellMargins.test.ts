import { describe, expect, it } from 'vitest';
import { idealChip, REFERENCE_STYLE } from '../../src/chip/idealChip.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import { identityMatrix } from '../../src/matrix/ComplexMatrix.js';
import { cellMargins } from '../../src/program/cellMargins.js';
import { programChip } from '../../src/program/programChip.js';
import { LAYOUTS } from '../../src/mesh/Mesh.js';

describe('margins of the cells', () => {
  // Conventions, section 5: cos^2(a+b) <= w <= cos^2(a-b). Ratios 0.4 and 0.5: sin 2a sin 2b =
  // 2 sqrt(0.24), cos 2a cos 2b = 0, so the ends are 1/2 -+ sqrt(0.24).
  it('are distances of bar powers to the nearer end', () => {
    const chip = { ...idealChip(2), couplingRatios: Float64Array.of(0.4, 0.5) };
    const [margin] = cellMargins(chip, programChip(chip, identityMatrix(2)).program);
    expect(margin!.wanted).toBe(1);
    expect(margin!.low).toBeCloseTo(0.5 - Math.sqrt(0.24), 14);
    expect(margin!.high).toBeCloseTo(0.5 + Math.sqrt(0.24), 14);
    expect(margin!.margin).toBeCloseTo(Math.sqrt(0.24) - 0.5, 14);
  });

  it('are below 0 for just those cells that the sweep finds out of reach', () => {
    for (const [layout, splitters] of LAYOUTS.flatMap((each) => [[each, 2] as const, [each, 3] as const])) {
      const ideal = idealChip(9, { layout, style: { ...REFERENCE_STYLE, splitters } });
      const couplingRatios = ideal.couplingRatios.map((_, k) => 0.5 + 0.12 * Math.sin(7 * k));
      const chip = { ...ideal, couplingRatios };
      const target = haarUnitary(9, 4);
      const { program } = programChip(chip, target);
      const { outOfReach } = program;
      const margins = cellMargins(chip, program);
      expect(margins).toHaveLength(36);
      expect(outOfReach.length).toBeGreaterThan(0);
      expect(margins.filter(({ margin }) => margin < 0).map(({ cellIndex }) => cellIndex)).toEqual(
        outOfReach.map(({ cellIndex }) => cellIndex),
      );
    }
  });
});

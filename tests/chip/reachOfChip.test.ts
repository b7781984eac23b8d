import { describe, expect, it } from 'vitest';
import { writeArms, writeSplitArms } from '../../src/chip/cellTransfer.js';
import type { Chip, PhaseRange } from '../../src/chip/Chip.js';
import { idealChip } from '../../src/chip/idealChip.js';
import { meshReach } from '../../src/chip/MeshReach.js';
import { cellReach } from '../../src/chip/reach.js';
import { reachOfChip } from '../../src/chip/reachOfChip.js';
import { shifterIndicesOfCell } from '../../src/chip/shifters.js';
import { ALL_STYLES, styleName } from '../support/styles.js';

const { PI } = Math;
const RATIOS: readonly (readonly [first: number, second: number])[] = [
  [0.5, 0.5],
  [0.45, 0.45],
  [0.45, 0.55],
  [0.62, 0.31],
  [0, 0.4],
  [1, 1],
];

describe('the reach of a chip', () => {
  it('is that of its splitters, in amplitudes', () => {
    const chip = idealChip(4);
    const { leastBar, leastCross } = reachOfChip({
      ...chip,
      couplingRatios: Float64Array.from(RATIOS.flat()),
    });
    RATIOS.forEach(([first, second], cell) => {
      const { low, high } = cellReach(first, second);
      expect(leastBar[cell]! ** 2).toBeCloseTo(low, 14);
      expect(1 - leastCross[cell]! ** 2).toBeCloseTo(high, 14);
    });
    // Both splitters at sin^2(pi/4 + x): cross missed by sin 2x, bar not at all.
    const half = Math.sin(PI / 4 + 1e-9) ** 2;
    const close = reachOfChip({ ...chip, couplingRatios: new Float64Array(12).fill(half) });
    expect(close.leastBar[0]).toBeCloseTo(2e-9, 15);
    expect(close.leastCross[0]).toBe(0);
  });

  // Against the cell's own transfer matrix, its internal phase tried all over the range.
  const ranges: readonly PhaseRange[] = [
    [0, 2 * PI],
    [1.2, 1.2],
    [0.3, 2],
    [2, 4],
    [-1, 0.5],
    [4, 7],
    [0, 0],
    [PI, PI],
  ];
  it.each(ALL_STYLES.map((style) => [styleName(style), style] as const))(
    'is what its internal phases can do within their ranges: %s',
    (_, style) => {
      const steps = 400;
      const arms = new Float64Array(4);
      const transfer = new Float64Array(8);
      // A third splitter stands beyond the external phase and plays no part.
      const atOutput = style.external.endsWith('output');
      const ofCell = RATIOS.map((pair) =>
        style.splitters === 2 ? pair : atOutput ? [...pair, 0.37] : [0.37, ...pair],
      );
      const couplingRatios = Float64Array.from(ofCell.flat());
      for (const [k, shifterRange] of ranges.entries()) {
        const base: Chip = { ...idealChip(4, { style }), couplingRatios, shifterRange };
        const own = ranges[(k + 1) % ranges.length]!;
        const shifterRanges = new Map([[shifterIndicesOfCell(base, 2).internal, own]]);
        const { leastBar, leastCross } = reachOfChip({ ...base, shifterRanges });
        RATIOS.forEach(([first, second], cell) => {
          const [low, high] = cell === 2 ? own : shifterRange;
          let bar = 1;
          let cross = 1;
          for (let step = 0; step <= steps; step++) {
            writeArms(arms, style.internal, low + ((high - low) * step) / steps, 1);
            writeSplitArms(transfer, style.splitterForm, first, second, arms);
            bar = Math.min(bar, Math.hypot(transfer[0]!, transfer[1]!));
            cross = Math.min(cross, Math.hypot(transfer[2]!, transfer[3]!));
          }
          // A step may pass a zero by half its width; ends are met exactly.
          const missed = (high - low) / steps / 2;
          for (const [found, tried] of [
            [leastBar[cell]!, bar],
            [leastCross[cell]!, cross],
          ] as const) {
            expect(found).toBeLessThan(tried + 1e-8);
            expect(found).toBeGreaterThan(tried - missed - 1e-8);
          }
        });
      }
    },
  );
});

describe('a reach from intervals of bar powers', () => {
  it('holds their amplitudes, a point for a cell that cannot be moved', () => {
    const { leastBar, leastCross } = meshReach([
      { low: 0, high: 1 },
      { low: 0.04, high: 0.64 },
      { low: 0.36, high: 0.36 },
    ]);
    [0, 0.2, 0.6].forEach((bar, cell) => expect(leastBar[cell]).toBeCloseTo(bar, 15));
    [0, 0.6, 0.8].forEach((cross, cell) => expect(leastCross[cell]).toBeCloseTo(cross, 15));
  });

  it.each([
    [-0.1, 0.5],
    [0.6, 0.5],
    [0.2, 1.1],
    [NaN, 0.5],
    [0.5, NaN],
  ])('refuses the interval from %f to %f', (low, high) => {
    expect(() => meshReach([{ low, high }])).toThrow(RangeError);
  });
});

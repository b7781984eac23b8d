import { describe, expect, it } from 'vitest';
import { InputError } from '../../src/errors/InputError.js';
import type { BudgetRow } from '../../src/figure/drawBudget.js';
import { drawBudget } from '../../src/figure/drawBudget.js';
import type { ComparisonGroup } from '../../src/figure/drawComparison.js';
import { drawComparison } from '../../src/figure/drawComparison.js';
import type { CumulativeCurveOptions } from '../../src/figure/drawCumulativeCurve.js';
import { drawCumulativeCurve } from '../../src/figure/drawCumulativeCurve.js';
import { drawHistogram } from '../../src/figure/drawHistogram.js';
import type { SweepCurveOptions, SweepPoint } from '../../src/figure/drawSweepCurve.js';
import { drawSweepCurve } from '../../src/figure/drawSweepCurve.js';
import { randomStream } from '../../src/random/RandomStream.js';
import { clopperPearson } from '../../src/statistics/binomialInterval.js';
import { byId, named, numberOf, ofClass, overlap, textBox } from './figureParts.js';
import type { XmlElement } from './readXml.js';
import { allElements, readXml } from './readXml.js';

const stream = randomStream(1, 902);
const FIDELITIES = Float64Array.from({ length: 2000 }, () => {
  let square = 0;
  for (let k = 0; k < 8; k++) square += stream.normal() ** 2;
  return Math.exp(-0.0008 * square);
});
const DECADES = Float64Array.from({ length: 2000 }, () => 10 ** (-9 + 7 * stream.uniform()));
const STRAGGLING = Float64Array.from({ length: 2000 }, (_, i) =>
  i < 3 ? 0.2 : 0.99 + 0.01 * stream.uniform(),
);
const LONG =
  'a quantity whose name is longer than any column of a page is wide, so that it must be wrapped (dB)';

const SAMPLES: readonly [what: string, values: Float64Array, options: CumulativeCurveOptions][] = [
  [
    'usual',
    FIDELITIES,
    { label: 'fidelity', threshold: 0.99, title: 'A <title> & more', captionLines: ['a line', LONG] },
  ],
  ['no threshold', FIDELITIES, { label: 'fidelity' }],
  ['all equal', new Float64Array(50).fill(0.9973), { label: 'fidelity', threshold: 0.99 }],
  ['all on the threshold', new Float64Array(50).fill(0.99), { label: 'fidelity', threshold: 0.99 }],
  ['all perfect', new Float64Array(50).fill(1), { label: 'fidelity' }],
  ['all zero', new Float64Array(50), { label: 'error', threshold: 0.1, thresholdIsUpperLimit: true }],
  ['all pass', FIDELITIES.map((f) => 1 - (1 - f) / 1e6), { label: 'fidelity', threshold: 0.99 }],
  ['nearly 1', FIDELITIES.map((f) => 1 - (1 - f) / 1e10), { label: 'fidelity', threshold: 1 - 1e-12 }],
  // The number at the end of the axis is wider than the margin beside it.
  ['many nines', FIDELITIES.map((f) => 1 - (1 - f) / 1e5), { label: 'fidelity', width: 58 }],
  ['many nines, wide', FIDELITIES.map((f) => 1 - (1 - f) / 1e8), { label: 'fidelity', width: 140 }],
  ['none passes', FIDELITIES.map((f) => 0.6 * f), { label: 'fidelity', threshold: 0.99 }],
  ['one chip', new Float64Array([0.9876]), { label: 'fidelity', threshold: 0.99 }],
  ['decades', DECADES, { label: 'infidelity', threshold: 1e-4, thresholdIsUpperLimit: true }],
  [
    'decades, linear',
    DECADES,
    { label: 'infidelity', threshold: 1e-9, thresholdIsUpperLimit: true, logX: false },
  ],
  ['stragglers', STRAGGLING, { label: 'fidelity', threshold: 0.995 }],
  ['tiny', DECADES.map((v) => 1e-12 * (1 + v)), { label: 'infidelity' }],
  [
    'negative, narrow',
    FIDELITIES.map((f) => 100 * f - 103),
    { label: LONG, threshold: -3.9, width: 30, title: LONG },
  ],
  ['wide', FIDELITIES, { label: 'fidelity', threshold: 0.9999, width: 'two-column' }],
];

function sweep(xs: readonly number[], trials = 300): SweepPoint[] {
  return xs.map((x) => {
    const passing = Math.round(trials / (1 + (x / 0.02) ** 4));
    return {
      x,
      share: passing / trials,
      ...clopperPearson(passing, trials, 0.95),
      mean: Math.exp(-14 * x * x),
    };
  });
}
const steps = (low: number, high: number, count: number): number[] =>
  Array.from({ length: count }, (_, i) => low + ((high - low) * i) / (count - 1));
const SWEEP: SweepCurveOptions = { label: 'sigma', threshold: 'fidelity ≥ 0.99' };
const SWEEPS: readonly [what: string, points: SweepPoint[], options: SweepCurveOptions][] = [
  [
    'ten',
    sweep(steps(0.005, 0.05, 10)),
    { ...SWEEP, theory: steps(0, 0.06, 50).map((x) => ({ x, y: 1 - 10 * x })) },
  ],
  ['one', sweep([0.01]), SWEEP],
  ['one at zero', sweep([0]), SWEEP],
  ['two', sweep([0.01, 0.02]), { ...SWEEP, label: LONG, threshold: LONG, title: LONG, width: 40 }],
  ['forty', sweep(steps(0.001, 0.06, 40)), SWEEP],
  ['decades', sweep([1e-9, 1e-7, 1e-4, 1e-3, 1]), { ...SWEEP, width: 50 }],
  ['less than a decade, log', sweep([0.011, 0.012]), { ...SWEEP, logX: true }],
  ['modes', sweep([2, 3, 4]), SWEEP],
];

const estimate = (mean: number): { mean: number; standardError: number } => ({
  mean,
  standardError: 0.05 * Math.abs(mean),
});
const ROWS: readonly BudgetRow[] = [
  { source: 'bits', alone: estimate(8e-4), without: estimate(7e-3) },
  { source: 'sigma', alone: estimate(5.6e-3), without: estimate(2e-3) },
  { source: LONG, alone: estimate(1.2e-3), without: estimate(6.6e-3) },
];
const FAR_ROWS: readonly BudgetRow[] = [
  ...ROWS,
  { source: 'one trial', alone: { mean: 3e-9, standardError: null }, without: estimate(7e-3) },
  { source: 'nothing', alone: { mean: 0, standardError: 0 }, without: { mean: 1e-5, standardError: 1e-5 } },
];
/** With correlations, which are nothing alone, in an order of their own, and with shares of good chips. */
const CORRELATED_ROWS: readonly BudgetRow[] = [
  { source: 'correlationLength', without: { ...estimate(6e-3), share: 0.9648 } },
  { source: 'pairCorrelation', without: { ...estimate(6.9e-3), share: 0.92 } },
  ...ROWS.map((row) => ({
    ...row,
    alone: { ...row.alone!, share: 1 },
    without: { ...row.without, share: 0.5 },
  })),
];

const compared = (label: string, mean: number, passed: number): ComparisonGroup['rows'][number] => ({
  label,
  error: estimate(mean),
  passed,
  trials: 1000,
});
const GROUPS: readonly ComparisonGroup[] = [
  {
    label: 'rectangular, 2 splitters a cell',
    facts: '8 columns, 56 splitters, 64 shifters, 0.84 dB of loss',
    rows: [compared('none', 0.0125, 247), compared('cell', 4.8e-5, 999), compared('refine', 1.2e-5, 1000)],
  },
  { label: 'triangular', rows: [compared('none', 0.013, 0), compared(LONG, 3e-9, 1000)] },
  {
    label: LONG,
    facts: LONG,
    rows: [
      compared('perfect', -1e-16, 1000),
      { label: 'one chip', error: { mean: 1e-4, standardError: null }, passed: 1, trials: 1 },
      // Its interval goes below 0, where a logarithmic axis has no place.
      { label: 'few chips', error: { mean: 1e-5, standardError: 2e-5 }, passed: 1, trials: 2 },
    ],
  },
];

/** No text leaves the page, overlaps another or is smaller than 6 pt. */
function expectLegible(svg: string, what: string): XmlElement {
  const root = readXml(svg);
  const [, , width, height] = root.attributes.get('viewBox')!.split(' ').map(Number) as [
    0,
    0,
    number,
    number,
  ];
  const texts = named(root, 'text');
  const boxes = texts.map(textBox);
  boxes.forEach((box, i) => {
    const inside = box.left >= 0 && box.right <= width && box.top >= 0 && box.bottom <= height;
    if (!inside) expect.fail(`${what}: ${box.what} leaves the page: ${JSON.stringify(box)}`);
    const other = boxes.slice(i + 1).find((later) => overlap(box, later));
    if (other) expect.fail(`${what}: ${box.what} overlaps ${other.what}`);
    // The viewBox's unit is a printed millimetre; a point is 25.4/72 mm.
    expect(numberOf(texts[i]!, 'font-size') * (72 / 25.4)).toBeGreaterThanOrEqual(6);
  });
  expect(svg).not.toMatch(/NaN|Infinity|undefined/);
  expect(root.attributes.get('role')).toBe('img');
  expect(root.children.slice(0, 2).map((child) => child.name)).toEqual(['title', 'desc']);
  const ids = allElements(root).flatMap((element) => element.attributes.get('id') ?? []);
  expect(new Set(ids).size).toBe(ids.length);
  return root;
}

const textsOf = (root: XmlElement, id: string): string[] =>
  named(byId(root, id), 'text').map((text) => text.text);
/** Numbers as the axes write them. */
function numberFrom(text: string): number {
  const plain = text.replace('−', '-').replace(/^10(?=[⁻⁰-⁹¹²³])/, '1×10');
  const [mantissa, power] = plain.split('×10');
  const exponent = [...(power ?? '')]
    .map((c) => (c === '⁻' ? '-' : String('⁰¹²³⁴⁵⁶⁷⁸⁹'.indexOf(c))))
    .join('');
  return Number(`${mantissa}e${exponent === '' ? '0' : exponent}`);
}

/** From millimetres along the horizontal axis back to values, by the ticks that the figure itself shows. */
function horizontalScale(root: XmlElement, log: boolean): (x: number) => number {
  const ticks = named(byId(root, 'horizontal-ticks'), 'text');
  const [first, last] = [ticks[0]!, ticks.at(-1)!];
  const place = (text: XmlElement): number =>
    log ? Math.log10(numberFrom(text.text)) : numberFrom(text.text);
  const slope = (place(last) - place(first)) / (numberOf(last, 'x') - numberOf(first, 'x'));
  return (x) => {
    const value = place(first) + slope * (x - numberOf(first, 'x'));
    return log ? 10 ** value : value;
  };
}

/** From millimetres down the page to values of the vertical axis. */
function verticalScale(root: XmlElement): (y: number) => number {
  const ticks = named(byId(root, 'vertical-ticks'), 'text');
  const [first, last] = [ticks[0]!, ticks.at(-1)!];
  const slope =
    (numberFrom(last.text) - numberFrom(first.text)) / (numberOf(last, 'y') - numberOf(first, 'y'));
  const bottom = Number(/V(\S+?)M/.exec(byId(root, 'vertical-axis').attributes.get('d')!)![1]);
  return (y) => slope * (y - bottom);
}

interface Bar {
  readonly left: number;
  readonly right: number;
  readonly count: number;
}

function barsOf(root: XmlElement, id: string): Bar[] {
  const toCount = verticalScale(root);
  const path = allElements(root).find((element) => element.attributes.get('id') === id);
  return [...(path?.attributes.get('d') ?? '').matchAll(/M(\S+) \S+V(\S+)H(\S+)V\S+Z/g)].map(
    ([, left, top, right]) => ({
      left: Number(left),
      right: Number(right),
      count: toCount(Number(top)),
    }),
  );
}

describe('curve figures are legible', () => {
  it.each(SAMPLES)('histogram and cumulative curve: %s', (what, values, options) => {
    expectLegible(drawHistogram(values, options), `histogram, ${what}`);
    expectLegible(drawCumulativeCurve(values, options), `curve, ${what}`);
  });

  it.each(SWEEPS)('sweep: %s', (what, points, options) => {
    expectLegible(drawSweepCurve(points, options), what);
  });

  it('budgets, on either axis and narrow', () => {
    for (const rows of [ROWS, FAR_ROWS, ROWS.slice(0, 1), CORRELATED_ROWS]) {
      for (const width of [40, 'one-column', 'two-column'] as const) {
        for (const log of [true, false, undefined]) {
          const options = { width, title: LONG, captionLines: [LONG], ...(log === undefined ? {} : { log }) };
          expectLegible(drawBudget(rows, estimate(7.8e-3), options), `${rows.length} ${width} ${log}`);
        }
      }
    }
  });
});

describe('a comparison', () => {
  it('is legible, whatever its width', () => {
    for (const groups of [GROUPS, GROUPS.slice(0, 1), GROUPS.slice(1, 2), GROUPS.slice(2)]) {
      for (const width of [30, 40, 60, 'one-column', 'two-column'] as const) {
        const options = { width, title: LONG, captionLines: [LONG], shareLabel: LONG, notes: [LONG] };
        expectLegible(drawComparison(groups, options), `${groups.length} ${width}`);
      }
    }
    const perfect = [{ label: 'ideal', rows: [compared('cell', 0, 1000)] }];
    const root = expectLegible(drawComparison(perfect), 'perfect');
    expect(ofClass(root, 'bar')).toHaveLength(0);
    expect(textsOf(root, 'row-1')).toEqual(['cell', '100 %', '< 10⁻¹²']);
  });

  it('has dots where the means are, whiskers over their intervals, and the shares in figures', () => {
    const root = readXml(drawComparison(GROUPS.slice(0, 1), { confidence: 0.95, width: 'two-column' }));
    const toValue = horizontalScale(root, true);
    GROUPS[0]!.rows.forEach(({ label, error, passed }, k) => {
      const row = byId(root, `row-${k + 1}`);
      const [dot] = ofClass(row, 'bar');
      expect(toValue(numberOf(dot!, 'cx')) / error.mean).toBeCloseTo(1, 3);
      const [, from, to] = /^M(\S+) \S+H(\S+?)M/.exec(ofClass(row, 'whisker')[0]!.attributes.get('d')!)!;
      // 1.959964 standard errors on either side (normal quantile at 0.975).
      expect(toValue(Number(from)) / (error.mean - 1.959964 * error.standardError!)).toBeCloseTo(1, 3);
      expect(toValue(Number(to)) / (error.mean + 1.959964 * error.standardError!)).toBeCloseTo(1, 3);
      const texts = named(row, 'text').map(({ text }) => text);
      expect(texts.slice(0, 2)).toEqual([label, `${passed / 10} %`]);
    });
  });

  it('refuses nothing, and numbers that are none', () => {
    expect(() => drawComparison([])).toThrow(RangeError);
    expect(() => drawComparison([{ label: 'a', rows: [compared('b', NaN, 1)] }])).toThrow(RangeError);
    expect(() => drawComparison(GROUPS, { confidence: 1 })).toThrow(RangeError);
    expect(() => drawComparison(GROUPS, { width: 20 })).toThrow(InputError);
  });
});

describe('a histogram', () => {
  it('shows every value once, and the good apart from the bad', () => {
    for (const [what, values, options] of SAMPLES) {
      const root = readXml(drawHistogram(values, options));
      const total = (id: string): number => barsOf(root, id).reduce((sum, { count }) => sum + count, 0);
      const { threshold = -Infinity, thresholdIsUpperLimit = false } = options;
      const passing = values.filter((v) => (thresholdIsUpperLimit ? v <= threshold : v >= threshold)).length;
      const hidden = /Not shown: (\d+) below/.exec(
        root.children.map(({ children }) => children.map((c) => c.text).join()).join(),
      )?.[1];
      // Heights are rounded to a micrometre, which is up to 0.05 chips a bar here.
      const tolerance = Math.max(1, 0.002 * values.length);
      expect(Math.abs(total('passing') - passing), what).toBeLessThan(tolerance);
      expect(Math.abs(total('failing') - (values.length - passing - Number(hidden ?? 0))), what).toBeLessThan(
        tolerance,
      );
    }
  });

  it('has the threshold as an edge between the two tones, under its line', () => {
    const root = readXml(drawHistogram(FIDELITIES, { label: 'fidelity', threshold: 0.9912 }));
    const line = Number(/^M(\S+) /.exec(byId(root, 'mark-line').attributes.get('d')!)![1]);
    expect(Math.max(...barsOf(root, 'failing').map(({ right }) => right))).toBe(line);
    expect(Math.min(...barsOf(root, 'passing').map(({ left }) => left))).toBe(line);
    expect(horizontalScale(root, false)(line)).toBeCloseTo(0.9912, 6);
  });

  it('counts a value on the threshold as good, on a linear and on a logarithmic axis', () => {
    const values = new Float64Array([0.001, 0.003, 0.03, 0.3]);
    for (const logX of [true, false]) {
      for (const thresholdIsUpperLimit of [true, false]) {
        const root = readXml(
          drawHistogram(values, { label: 'x', threshold: 0.03, thresholdIsUpperLimit, logX }),
        );
        const count = barsOf(root, 'passing').reduce((sum, bar) => sum + bar.count, 0);
        expect(Math.round(count)).toBe(thresholdIsUpperLimit ? 3 : 2);
      }
    }
  });

  it('has bars where the values are', () => {
    const root = readXml(drawHistogram(new Float64Array([0.2, 0.2, 0.2, 0.8]), { label: 'x' }));
    const toValue = horizontalScale(root, false);
    const bars = barsOf(root, 'passing');
    expect(bars.map(({ count }) => Math.round(count))).toEqual([3, 1]);
    expect(toValue(bars[0]!.left)).toBeLessThanOrEqual(0.2001);
    expect(toValue(bars[0]!.right)).toBeGreaterThanOrEqual(0.1999);
    expect(toValue(bars[1]!.left)).toBeLessThanOrEqual(0.8001);
    expect(toValue(bars[1]!.right)).toBeGreaterThanOrEqual(0.7999);
  });

  it('says how many stragglers it leaves out, and never hides a threshold', () => {
    const svg = drawHistogram(STRAGGLING, { label: 'fidelity', threshold: 0.995 });
    expect(textsOf(readXml(svg), 'notes').join(' ')).toMatch(/^Not shown: 3 below 0\.98\d*\.$/);
    const off = readXml(
      drawHistogram(
        FIDELITIES.map((f) => 0.6 * f),
        { label: 'fidelity', threshold: 0.99 },
      ),
    );
    expect(textsOf(off, 'mark')).toEqual(['≥ 0.99: 0 % of chips →']);
  });
});

describe('a cumulative curve', () => {
  const vertices = (root: XmlElement, id: string): [number, number][] =>
    [
      ...byId(root, id)
        .attributes.get('d')!
        .matchAll(/[ML](-?[\d.]+),(-?[\d.]+)/g),
    ].map(([, x, y]) => [Number(x), Number(y)]);
  const heightAt = (points: readonly [number, number][], x: number): number => {
    const next = points.findIndex(([px]) => px > x);
    return points[next < 0 ? points.length - 1 : next - 1]![1];
  };

  it('is the share of chips at or beyond each value, in both senses', () => {
    for (const atMost of [false, true]) {
      const svg = drawCumulativeCurve(FIDELITIES, { label: 'fidelity', thresholdIsUpperLimit: atMost });
      const root = readXml(svg);
      const toValue = horizontalScale(root, false);
      const toShare = verticalScale(root);
      const points = vertices(root, 'curve');
      for (let i = 20; i < points.length; i += 37) {
        const x = points[i]![0] + 0.0003;
        const value = toValue(x);
        const share = FIDELITIES.filter((f) => (atMost ? f <= value : f >= value)).length / FIDELITIES.length;
        // Thinned to 400 of 2000 steps: within 5 chips, and a micrometre of rounding across a steep slope.
        expect(Math.abs(toShare(heightAt(points, x)) / 100 - share)).toBeLessThan(0.006);
      }
      expect(points.length).toBeLessThan(900);
    }
  });

  it('steps down behind a value, and up at it', () => {
    for (const atMost of [false, true]) {
      const root = readXml(
        drawCumulativeCurve(new Float64Array([0.2, 0.8]), { label: 'x', thresholdIsUpperLimit: atMost }),
      );
      const toShare = verticalScale(root);
      const shares = new Set(vertices(root, 'curve').map(([, y]) => Math.round(toShare(y))));
      expect([...shares]).toEqual(atMost ? [0, 50, 100] : [100, 50, 0]);
    }
  });

  it('has a band of Clopper and Pearson, and writes the share at the threshold with its interval', () => {
    // 0 of 10 and 10 of 10 at 95 %: 0 to 0.308497 and 0.691503 to 1 (textbook values, see the tests of
    // clopperPearson).
    const root = readXml(drawCumulativeCurve(new Float64Array(10).fill(0.5), { label: 'x', threshold: 0.5 }));
    const toShare = verticalScale(root);
    const levels = vertices(root, 'band').map(([, y]) => toShare(y) / 100);
    for (const wanted of [0, 0.308497, 0.691503, 1]) {
      expect(Math.min(...levels.map((level) => Math.abs(level - wanted)))).toBeLessThan(1e-4);
    }
    expect(textsOf(root, 'mark')).toEqual(['≥ 0.5: 100 % (69 to 100)']);
    const usual = readXml(drawCumulativeCurve(FIDELITIES, { label: 'x', threshold: 0.99 }));
    const passing = FIDELITIES.filter((f) => f >= 0.99).length;
    const { low, high } = clopperPearson(passing, 2000, 0.95);
    const [, share, from, to] = /: (\S+) % \((\S+) to (\S+)\)/.exec(textsOf(usual, 'mark')[0]!)!;
    expect(Math.abs(Number(share) - passing / 20)).toBeLessThanOrEqual(0.5);
    expect(Math.abs(Number(from) - 100 * low)).toBeLessThanOrEqual(0.5);
    expect(Math.abs(Number(to) - 100 * high)).toBeLessThanOrEqual(0.5);
  });
});

describe('a sweep', () => {
  it('puts every point and its interval at its place, in the order of x', () => {
    for (const [what, points, options] of SWEEPS.filter(
      ([name]) => name !== 'one' && name !== 'one at zero',
    )) {
      const root = readXml(drawSweepCurve([...points].reverse(), options));
      const log = options.logX ?? points.at(-1)!.x > 10.01 * points[0]!.x;
      const toValue = horizontalScale(root, log);
      const toShare = verticalScale(root);
      points.forEach(({ x, share, low, high }, i) => {
        const group = byId(root, `point-${i + 1}`);
        const circle = named(group, 'circle')[0]!;
        expect(Math.abs(toValue(numberOf(circle, 'cx')) / x - 1), what).toBeLessThan(0.02);
        expect(toShare(numberOf(circle, 'cy'))).toBeCloseTo(100 * share, 1);
        const [, bottom, top] = /^M\S+ (\S+?)V([\d.]+)/.exec(named(group, 'path')[0]!.attributes.get('d')!)!;
        expect(toShare(Number(bottom))).toBeCloseTo(100 * low, 1);
        expect(toShare(Number(top))).toBeCloseTo(100 * high, 1);
        const mean = numberFrom(/mean (\S+)$/.exec(group.children[0]!.text)![1]!);
        expect(Math.abs(mean / Math.exp(-14 * x * x) - 1)).toBeLessThan(1e-5);
      });
    }
  });

  it('takes a logarithmic axis beyond a decade, and whole ticks for whole quantities', () => {
    const ticks = (xs: readonly number[]): number[] =>
      textsOf(readXml(drawSweepCurve(sweep(xs), SWEEP)), 'horizontal-ticks').map(numberFrom);
    expect(ticks([0.001, 0.01, 0.1])).toEqual([0.001, 0.01, 0.1]);
    expect(ticks([0.002, 0.005, 0.03])).toEqual([0.002, 0.005, 0.01, 0.02]);
    expect(ticks([0.005, 0.05])).toEqual([0.01, 0.02, 0.03, 0.04, 0.05]);
    expect(ticks([2, 3, 4])).toEqual([2, 3, 4]);
  });
});

describe('a budget', () => {
  it('ranks the sources by what they cost alone, below all together', () => {
    const root = readXml(drawBudget(ROWS, estimate(7.8e-3)));
    const titles = [0, 1, 2, 3].map((row) => byId(root, `row-${row}`).children[0]!.text);
    expect(titles[0]).toBe('all sources together 0.0078');
    expect(titles[1]).toBe('sigma alone 0.0056, all but this one 0.002');
    expect(titles[3]).toBe('bits alone 0.0008, all but this one 0.007');
  });

  it('shows below them what is left without each correlation, and the shares of good chips in brackets', () => {
    const root = readXml(drawBudget(CORRELATED_ROWS, { ...estimate(7.8e-3), share: 0.9 }));
    const titles = [0, 1, 4, 5].map((row) => byId(root, `row-${row}`).children[0]!.text);
    expect(titles).toEqual([
      'all sources together 0.0078 (90 %)',
      'sigma alone 0.0056 (100 %), all but this one 0.002 (50 %)',
      'correlationLength left out 0.006 (96.5 %)',
      'pairCorrelation left out 0.0069 (92 %)',
    ]);
    expect(ofClass(root, 'bar')).toHaveLength(1 + 2 * 3 + 2);
    // One bar each, in the colour of what is left without something.
    const [bar, second] = ofClass(byId(root, 'row-4'), 'bar');
    expect([bar!.attributes.get('fill'), second]).toEqual([
      ofClass(byId(root, 'without-1'), 'bar')[0]!.attributes.get('fill'),
      undefined,
    ]);
    const toValue = horizontalScale(root, false);
    expect(toValue(numberOf(bar!, 'x') + numberOf(bar!, 'width'))).toBeCloseTo(6e-3, 5);
    expect(
      named(root, 'text')
        .map(({ text }) => text)
        .join(' '),
    ).toContain('share of good chips');
  });

  it('has bars as long as the numbers beside them, and whiskers of 1.96 standard errors', () => {
    const root = readXml(drawBudget(ROWS, estimate(7.8e-3)));
    const toValue = horizontalScale(root, false);
    const bars = ofClass(root, 'bar');
    expect(bars).toHaveLength(7);
    for (const bar of bars) {
      const mean = numberFrom(named(bar.parent!, 'text')[0]!.text);
      expect(toValue(numberOf(bar, 'x'))).toBeCloseTo(0, 5);
      expect(toValue(numberOf(bar, 'x') + numberOf(bar, 'width'))).toBeCloseTo(mean, 5);
      const [, low, high] = /^M(\S+) \S+?H([\d.]+)M/.exec(
        ofClass(bar.parent!, 'whisker')[0]!.attributes.get('d')!,
      )!;
      expect((toValue(Number(high)) - toValue(Number(low))) / (2 * 0.05 * mean)).toBeCloseTo(1.95996, 1);
    }
  });

  it('marks values with dots on a logarithmic axis, where nothing stands for zero', () => {
    const root = readXml(drawBudget(FAR_ROWS, estimate(7.8e-3)));
    const toValue = horizontalScale(root, true);
    for (const dot of ofClass(root, 'bar')) {
      const mean = numberFrom(named(dot.parent!, 'text')[0]!.text);
      expect(Math.abs(toValue(numberOf(dot, 'cx')) / mean - 1)).toBeLessThan(0.01);
    }
    expect(ofClass(root, 'bar')).toHaveLength(10);
    expect(textsOf(root, 'alone-5')).toEqual(['0']);
    expect(ofClass(byId(root, 'alone-4'), 'whisker')).toHaveLength(0);
  });
});

describe('curve figures', () => {
  const draw = [
    (): string => drawHistogram(FIDELITIES, { label: '<x> & y', threshold: 0.99, title: '"<svg>"' }),
    (): string => drawCumulativeCurve(FIDELITIES, { label: '<x> & y', threshold: 0.99, title: '"<svg>"' }),
    (): string =>
      drawSweepCurve(sweep([0.01, 0.02]), { label: '<x> & y', threshold: '<b>', title: '"<svg>"' }),
    (): string => drawBudget([{ ...ROWS[0]!, source: '<x> & y' }], estimate(1), { title: '"<svg>"' }),
  ];

  it('give the same bytes again, and keep markup as text', () => {
    for (const figure of draw) {
      const once = figure();
      draw[0]!();
      expect(figure()).toBe(once);
      const root = readXml(once);
      expect(root.children[0]!.text).toBe('"<svg>"');
      expect(named(root, 'text').map(({ text }) => text)).toContain('<x> & y');
      expect(named(root, 'x')).toHaveLength(0);
    }
  });

  it('refuse what cannot be drawn', () => {
    const bad: [() => string, new (...args: never[]) => Error][] = [
      [() => drawHistogram(new Float64Array(0), { label: 'x' }), RangeError],
      [() => drawHistogram(new Float64Array([NaN]), { label: 'x' }), RangeError],
      [() => drawHistogram(new Float64Array([1]), { label: 'x', threshold: NaN }), RangeError],
      [() => drawHistogram(new Float64Array([0, 1]), { label: 'x', logX: true }), RangeError],
      [() => drawHistogram(new Float64Array([1]), { label: 'x', width: 29 }), InputError],
      [() => drawCumulativeCurve(new Float64Array([1]), { label: 'x', confidence: 1 }), RangeError],
      [() => drawSweepCurve([], SWEEP), RangeError],
      [() => drawSweepCurve([{ x: 1, share: 0.5, low: 0.6, high: 0.7 }], SWEEP), RangeError],
      [() => drawSweepCurve([{ x: NaN, share: 0.5, low: 0.4, high: 0.7 }], SWEEP), RangeError],
      [() => drawSweepCurve(sweep([0, 1]), { ...SWEEP, logX: true }), RangeError],
      [() => drawBudget([], estimate(1)), RangeError],
      [() => drawBudget(ROWS, { mean: NaN, standardError: null }), RangeError],
      [() => drawBudget(ROWS, { mean: 1, standardError: -1 }), RangeError],
      [() => drawBudget(ROWS, estimate(1), { confidence: 95 }), RangeError],
    ];
    for (const [figure, kind] of bad) expect(figure).toThrow(kind);
  });
});

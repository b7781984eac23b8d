import { describe, expect, it } from 'vitest';
import { NO_ERRORS } from '../../src/chip/Chip.js';
import { InputError } from '../../src/errors/InputError.js';
import { chunkTrials } from '../../src/tolerance/chunking.js';
import {
  aloneWith,
  CORRELATIONS,
  COSTLY_SOURCES,
  ERROR_SOURCES,
  errorSource,
  hasErrors,
  requireConsistent,
  requirePossibleCorrelation,
  without,
  withSource,
} from '../../src/tolerance/errorSources.js';
import { columnOf, countPassed, judgedFigures } from '../../src/tolerance/thresholds.js';
import { planFor } from './trialPlans.js';

/** The code of the fault that something throws. */
function codeOf(act: () => unknown): string {
  try {
    act();
  } catch (error) {
    if (error instanceof InputError) return error.code;
    throw error;
  }
  return 'none';
}

describe('chunks of trials', () => {
  it('are the same for equal plans, whatever the seed, errors and figures', () => {
    const plan = planFor(8, { sigma: 0.01 });
    const others = [
      planFor(8, { sigma: 0.01 }),
      planFor(8, { phaseSigma: 0.3 }),
      { ...plan, seed: 5 },
      { ...plan, figures: ['rmsError', 'fidelity'] as const },
    ];
    for (const other of others) expect(chunkTrials(other)).toBe(chunkTrials(plan));
  });

  it('are even, never empty, and smaller for what takes longer', () => {
    let last = Infinity;
    for (const modes of [1, 2, 3, 8, 33, 64, 200]) {
      const plan = planFor(modes, {});
      const size = chunkTrials(plan);
      expect(size % 2).toBe(0);
      expect(size).toBeGreaterThanOrEqual(2);
      expect(size).toBeLessThanOrEqual(last);
      expect(chunkTrials({ ...plan, retune: 'cell' })).toBeLessThanOrEqual(size);
      expect(chunkTrials({ ...plan, target: 'haar' })).toBeLessThanOrEqual(size);
      last = size;
    }
    expect(last).toBeLessThan(20);
  });
});

describe('thresholds', () => {
  const figures = ['fidelity', 'rmsError'] as const;
  const rows = Float64Array.from([0.99, 0.1, 0.98, 0.05, 1, NaN, NaN, 0.01, 0.99, 0.2]);

  it('are lower limits of figures of merit and upper limits of errors, ends included', () => {
    expect(countPassed(rows, figures, [{ key: 'fidelity', limit: 0.99 }])).toBe(3);
    expect(countPassed(rows, figures, [{ key: 'rmsError', limit: 0.1 }])).toBe(3);
    expect(countPassed(rows, figures, [])).toBe(5);
  });

  it('must all hold, and NaN holds none', () => {
    const both = [
      { key: 'fidelity', limit: 0.99 },
      { key: 'rmsError', limit: 0.1 },
    ] as const;
    expect(countPassed(rows, figures, both)).toBe(1);
    expect(countPassed(rows, figures, [{ key: 'fidelity', limit: NaN }])).toBe(0);
    expect(countPassed(rows, figures, [{ key: 'fidelity', limit: -Infinity }])).toBe(4);
    // Two limits of one figure: the harder one counts.
    const twice = [
      { key: 'fidelity', limit: 0.5 },
      { key: 'fidelity', limit: 1 },
    ] as const;
    expect(countPassed(rows, figures, twice)).toBe(1);
  });

  it('name the figures to judge, fidelity always and each once', () => {
    expect(judgedFigures([])).toEqual(['fidelity']);
    const thresholds = [
      { key: 'rmsError', limit: 0.1 },
      { key: 'fidelity', limit: 0.9 },
      { key: 'rmsError', limit: 0.2 },
    ] as const;
    expect(judgedFigures(thresholds)).toEqual(['fidelity', 'rmsError']);
  });

  it('take their figure from the rows', () => {
    expect(Array.from(columnOf(rows, 2, 1))).toEqual([0.1, 0.05, NaN, 0.01, 0.2]);
    expect(columnOf(new Float64Array(0), 2, 1).length).toBe(0);
  });
});

describe('error sources', () => {
  it('are known by their names, and a slip is met with the nearest one', () => {
    for (const name of ERROR_SOURCES) expect(errorSource(name)).toBe(name);
    expect(codeOf(() => errorSource('sigmaangle'))).toBe('process/source');
    expect(() => errorSource('phasesigma')).toThrow(
      expect.objectContaining({ remedy: 'Did you mean phaseSigma?' }),
    );
    expect(codeOf(() => errorSource('toString'))).toBe('process/source');
  });

  it('are set one by one, and refuse what cannot be', () => {
    expect(withSource(NO_ERRORS, 'sigma', 0.02)).toEqual({ ...NO_ERRORS, sigma: 0.02 });
    expect(withSource(NO_ERRORS, 'bias', -0.02).bias).toBe(-0.02);
    for (const source of ERROR_SOURCES) {
      for (const value of [NaN, Infinity, -Infinity, -1.5, 1e7]) {
        expect(
          codeOf(() => withSource(NO_ERRORS, source, value)),
          `${source} ${value}`,
        ).toBe('process/range');
      }
      expect(withSource(NO_ERRORS, source, 0)).toEqual(NO_ERRORS);
    }
    expect(codeOf(() => withSource(NO_ERRORS, 'bits', 7.5))).toBe('process/bits');
    expect(codeOf(() => withSource(NO_ERRORS, 'pairCorrelation', 1.0001))).toBe('process/range');
  });

  it('cost something by themselves, correlations do not', () => {
    expect(hasErrors(NO_ERRORS)).toBe(false);
    for (const source of ERROR_SOURCES) {
      const shapesOnly = CORRELATIONS.some((correlation) => correlation === source);
      expect(hasErrors({ ...NO_ERRORS, [source]: 1 }), source).toBe(!shapesOnly);
    }
    expect(hasErrors({ ...NO_ERRORS, bias: -0.01 })).toBe(true);
    expect([...COSTLY_SOURCES, ...CORRELATIONS].sort()).toEqual([...ERROR_SOURCES].sort());
  });

  it('are looked at alone and left out, the correlations kept', () => {
    const all = { ...NO_ERRORS, sigma: 1, bias: 2, bits: 3, pairCorrelation: 0.4, correlationLength: 5 };
    expect(aloneWith(all, 'bits')).toEqual({ ...all, sigma: 0, bias: 0 });
    expect(aloneWith(all, 'sigma')).toEqual({ ...all, bits: 0, bias: 0 });
    expect(without(all, 'sigma')).toEqual({ ...all, sigma: 0 });
  });

  // A matrix of correlations r between three has the eigenvalue 1 + 2 r.
  it('refuse correlations that three splitters cannot have', () => {
    for (const [pairCorrelation, splitters, code] of [
      [-1, 2, 'none'],
      [-0.5, 3, 'none'],
      [-0.51, 3, 'process/correlation'],
      [NaN, 3, 'process/correlation'],
    ] as const) {
      expect(codeOf(() => requirePossibleCorrelation({ pairCorrelation }, { splitters }))).toBe(code);
    }
  });

  it('refuse correlations of uniform numbers, and of none', () => {
    for (const correlation of [{ pairCorrelation: -0.1 }, { correlationLength: 2 }]) {
      const local = { ...NO_ERRORS, ...correlation, sigmaAngle: 0.1 };
      expect(codeOf(() => requireConsistent(local))).toBe('none');
      expect(codeOf(() => requireConsistent({ ...local, distribution: 'uniform' }))).toBe('process/uniform');
      expect(codeOf(() => requireConsistent({ ...local, sigmaAngle: 0, biasSigma: 0.1 }))).toBe(
        'process/correlation',
      );
    }
    expect(codeOf(() => requireConsistent({ ...NO_ERRORS, distribution: 'uniform', sigma: 0.1 }))).toBe(
      'none',
    );
  });
});

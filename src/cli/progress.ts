import type { Console } from './console.js';

/** A line on a terminal that says how far a run is. */
export interface Progress {
  /** So many trials more are done; `known` when they were taken from disk and tell nothing of the rate. */
  advance(by: number, known: boolean): void;
  end(): void;
}

const BETWEEN_LINES = 200;

/**
 * Progress of `total` trials with their rate and the time left; silent where standard error is no terminal or
 * --quiet was given.
 */
export function createProgress(console: Console | undefined, total: number): Progress {
  if (console === undefined || !console.showsProgress)
    return { advance: () => undefined, end: () => undefined };
  const started = performance.now();
  let done = 0;
  let fresh = 0;
  let shown = -Infinity;
  return {
    advance: (by, known) => {
      done += by;
      if (!known) fresh += by;
      const now = performance.now();
      if (fresh === 0 || now - shown < BETWEEN_LINES) return;
      shown = now;
      const rate = (1000 * fresh) / (now - started);
      const left = Math.ceil((total - done) / rate);
      const percent = Math.floor((100 * done) / total);
      process.stderr.write(`\r\u001b[K${percent} %  ${Math.round(rate)} trials/s  ${left} s left`);
    },
    end: () => process.stderr.write('\r\u001b[K'),
  };
}

/** A line on a terminal that says how far a search is. */
export interface SearchProgress {
  show(progress: { readonly iterations: number; readonly cost: number }): void;
  end(): void;
}

/** Progress of a search for a minimum; silent where standard error is no terminal or --quiet was given. */
export function createSearchProgress(console: Console): SearchProgress {
  if (!console.showsProgress) return { show: () => undefined, end: () => undefined };
  let shown = -Infinity;
  return {
    show: ({ iterations, cost }) => {
      const now = performance.now();
      if (now - shown < BETWEEN_LINES) return;
      shown = now;
      process.stderr.write(`\r\u001b[Krefining: step ${iterations}, cost ${cost.toPrecision(4)}`);
    },
    end: () => {
      if (shown > -Infinity) process.stderr.write('\r\u001b[K');
    },
  };
}

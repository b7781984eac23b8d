import { InputError } from '../../../src/errors/InputError.js';
import { serveJobs } from '../../../src/files/serveJobs.js';

/** A job that says how it wants to be done, so that tests can have any course of events. */
export interface Order {
  readonly number: number;
  readonly milliseconds?: number;
  readonly behave?: 'throw' | 'input-error' | 'exit' | 'uncaught' | 'never' | 'uncloneable';
}

export interface Answer {
  readonly number: number;
  /** The pool's setup, to show that it came through. */
  readonly greeting: string;
  readonly rows: Float64Array;
  /**
   * Length of the rows of the answer before, as the worker sees it now: 0 when the buffer was handed over.
   */
  readonly keptLength: number;
}

let previous = new Float64Array(0);

serveJobs<{ readonly greeting: string; readonly fail?: boolean }, Order, Answer>(
  ({ greeting, fail }) => {
    if (fail === true) throw new Error('cannot be prepared');
    return async ({ number, milliseconds, behave }) => {
      if (milliseconds !== undefined) await new Promise((wake) => setTimeout(wake, milliseconds));
      if (behave === 'throw') throw new Error('the light went out');
      if (behave === 'input-error')
        throw new InputError('test/fault', 'a fault', 'Mend it.', { source: 'x.csv' });
      if (behave === 'exit') process.exit(7);
      if (behave === 'uncaught') {
        setTimeout(() => {
          throw new Error('from nowhere');
        });
        await new Promise(() => undefined);
      }
      if (behave === 'never') for (;;);
      if (behave === 'uncloneable')
        return { number, greeting: (() => '') as never, rows: previous, keptLength: 0 };
      const keptLength = previous.length;
      previous = Float64Array.of(number, number / 3);
      return { number, greeting, rows: previous, keptLength };
    };
  },
  ({ rows }) => [rows.buffer],
);

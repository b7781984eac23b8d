import { createContext, runInContext } from 'node:vm';

/**
 * Runs a function and stops it for certain when it takes longer than the limit, loops and matrix products
 * included.
 * @throws whatever the function throws; at the limit, an Error with code `ERR_SCRIPT_EXECUTION_TIMEOUT`
 */
export function runWithin<T>(milliseconds: number, run: () => T): T {
  const context = createContext({ run });
  return runInContext('run()', context, { timeout: milliseconds }) as T;
}

import { availableParallelism } from 'node:os';
import { InputError } from '../errors/InputError.js';

/**
 * More workers than cores may be asked for, to see that results do not change; up to this many on any
 * machine.
 */
const ALWAYS_ALLOWED = 16;
const PER_CORE = 4;
const MOST = 256;

/**
 * The number of workers to start: the one requested, or one per core.
 * @throws InputError `run/workers` when it is no whole number from 1 to four per core (16 are allowed on any
 * machine, 256 at most)
 */
export function sensibleWorkers(requested?: number, cores = availableParallelism()): number {
  const most = Math.min(MOST, Math.max(ALWAYS_ALLOWED, PER_CORE * cores));
  if (requested === undefined) return Math.min(cores, most);
  if (Number.isInteger(requested) && requested >= 1 && requested <= most) return requested;
  throw new InputError(
    'run/workers',
    `${requested} is not a sensible number of workers`,
    `Give a whole number from 1 to ${most}; this machine has ${cores} ${cores === 1 ? 'core' : 'cores'}.`,
  );
}

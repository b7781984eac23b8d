import type { CellStyle, ProcessErrors } from '../chip/Chip.js';
import { InputError } from '../errors/InputError.js';
import { nearestName } from '../errors/nearestName.js';

/** The error sources by name, as chip files, `--sweep`, `--source` and `--error` name them. */
export const ERROR_SOURCES = [
  'sigma',
  'sigmaAngle',
  'bias',
  'biasSigma',
  'pairCorrelation',
  'correlationLength',
  'phaseSigma',
  'bits',
  'lossSigmaDb',
] as const satisfies readonly (keyof ProcessErrors)[];
/** The name of an error source. */
export type ErrorSource = (typeof ERROR_SOURCES)[number];

/** What makes chips differ from the nominal one by itself; correlations only shape other sources. */
export const COSTLY_SOURCES = [
  'sigma',
  'sigmaAngle',
  'bias',
  'biasSigma',
  'phaseSigma',
  'bits',
  'lossSigmaDb',
] as const satisfies readonly ErrorSource[];

/** What shapes local errors, and costs nothing where there are none. */
export const CORRELATIONS = [
  'pairCorrelation',
  'correlationLength',
] as const satisfies readonly ErrorSource[];

/** Least and greatest value of each source. */
const LIMITS: Readonly<Record<ErrorSource, readonly [low: number, high: number]>> = {
  sigma: [0, 10],
  sigmaAngle: [0, 10],
  bias: [-1, 1],
  biasSigma: [0, 10],
  pairCorrelation: [-1, 1],
  correlationLength: [0, 1e6],
  phaseSigma: [0, 10],
  bits: [0, 32],
  lossSigmaDb: [0, 100],
};

/** True when the process has a source that costs something. */
export function hasErrors(errors: ProcessErrors): boolean {
  return COSTLY_SOURCES.some((source) => errors[source] !== 0);
}

/** The process with one source only, and the correlations that shape it. */
export function aloneWith(errors: ProcessErrors, source: ErrorSource): ProcessErrors {
  return COSTLY_SOURCES.reduce<ProcessErrors>(
    (rest, other) => (other === source ? rest : { ...rest, [other]: 0 }),
    errors,
  );
}

/** The process without one source. */
export function without(errors: ProcessErrors, source: ErrorSource): ProcessErrors {
  return { ...errors, [source]: 0 };
}

/**
 * The process with one source set to a value.
 * @throws InputError `process/...` for a value out of range, a number of bits that is not whole, or a
 * combination that cannot be
 */
export function withSource(errors: ProcessErrors, source: ErrorSource, value: number): ProcessErrors {
  const [low, high] = LIMITS[source];
  if (!(value >= low && value <= high)) {
    throw new InputError(
      'process/range',
      `${source} is ${value}, and lies between ${low} and ${high}`,
      low === 0 && value < 0 ? 'A spread is not negative.' : `Give a number from ${low} to ${high}.`,
    );
  }
  if (source === 'bits' && !Number.isInteger(value)) {
    throw new InputError(
      'process/bits',
      `bits is ${value}`,
      'Give a whole number of bits, 0 for continuous phases.',
    );
  }
  return { ...errors, [source]: value };
}

/**
 * Refuses what cannot be simulated together.
 * @throws InputError `process/uniform`, `process/correlation`
 */
export function requireConsistent(errors: ProcessErrors): void {
  const correlated = errors.pairCorrelation !== 0 || errors.correlationLength !== 0;
  if (correlated && errors.distribution === 'uniform') {
    throw new InputError(
      'process/uniform',
      'uniform errors cannot be correlated: a sum of uniform numbers is not uniform',
      'Take the normal distribution, or leave out pairCorrelation and correlationLength.',
    );
  }
  if (correlated && errors.sigma === 0 && errors.sigmaAngle === 0) {
    throw new InputError(
      'process/correlation',
      'there is nothing to correlate: sigma and sigmaAngle are 0',
      'Give a local spread, sigma or sigmaAngle, or leave out pairCorrelation and correlationLength.',
    );
  }
}

/**
 * Refuses a correlation that the splitters of a cell cannot have: of three, no two of which differ from each
 * other in law, the correlation of any two is at least -1/2.
 * @throws InputError `process/correlation`
 */
export function requirePossibleCorrelation(
  { pairCorrelation }: Pick<ProcessErrors, 'pairCorrelation'>,
  { splitters }: Pick<CellStyle, 'splitters'>,
): void {
  if (splitters === 3 && !(pairCorrelation >= -1 / 2)) {
    throw new InputError(
      'process/correlation',
      `pairCorrelation is ${pairCorrelation}, and cells of three splitters allow -0.5 or more`,
      'Three errors cannot all be opposite to each other: give a number from -0.5 to 1.',
    );
  }
}

/** The source of a name. @throws InputError `process/source` with the nearest name */
export function errorSource(name: string): ErrorSource {
  const known = ERROR_SOURCES.find((source) => source === name);
  if (known !== undefined) return known;
  const near = nearestName(name, ERROR_SOURCES);
  throw new InputError(
    'process/source',
    `there is no error source ${name}`,
    near === undefined ? `Sources are ${ERROR_SOURCES.join(', ')}.` : `Did you mean ${near}?`,
  );
}

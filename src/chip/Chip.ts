import type { Mesh } from '../mesh/Mesh.js';

/** The guide arm on which the internal phase sits: `differential` is +theta/2 above and -theta/2 below. */
export const INTERNAL_ARMS = ['upper', 'lower', 'differential'] as const;
/** Where the internal phase sits. */
export type InternalArm = (typeof INTERNAL_ARMS)[number];

/** The guide on which the external phase sits, before or behind the two splitters of the internal phase. */
export const EXTERNAL_GUIDES = ['upper-input', 'lower-input', 'upper-output', 'lower-output'] as const;
/** Where the external phase sits. */
export type ExternalGuide = (typeof EXTERNAL_GUIDES)[number];

/** `symmetric`: [[cos a, i sin a], [i sin a, cos a]]; `real`: [[cos a, sin a], [sin a, -cos a]]. */
export const SPLITTER_FORMS = ['symmetric', 'real'] as const;
/** The form of a splitter's matrix. */
export type SplitterForm = (typeof SPLITTER_FORMS)[number];

/**
 * Splitters of a cell. The third one stands on the far side of the external phase: light meets it before an
 * external phase at the input, or behind one at the output. It moves what a cell cannot reach away from the
 * full cross and bar states: Hamerly, Bandyopadhyay, Englund, Nat. Commun. 13, 6831 (2022).
 */
export const SPLITTER_COUNTS = [2, 3] as const;
/** How many splitters a cell has. */
export type SplitterCount = (typeof SPLITTER_COUNTS)[number];

/** How every cell of a chip is built, as it stands on the chip. */
export interface CellStyle {
  readonly internal: InternalArm;
  readonly external: ExternalGuide;
  readonly splitterForm: SplitterForm;
  readonly splitters: SplitterCount;
}

/** Amplitude factors in (0, 1]; 1 is no loss. */
export interface ChipLoss {
  /** On both ports at each splitter passed. */
  readonly splitter: number;
  /** On the one guide of each phase shifter, whatever its setting; on both arms of a differential one. */
  readonly shifter: number;
  /** On all ports at each column. */
  readonly column: number;
  /** Facets, per port. */
  readonly input: Float64Array;
  readonly output: Float64Array;
}

/** Distributions of random errors; both are given by their standard deviation. */
export const ERROR_DISTRIBUTIONS = ['normal', 'uniform'] as const;
/** A distribution of random errors. */
export type ErrorDistribution = (typeof ERROR_DISTRIBUTIONS)[number];

/**
 * How chips of a process differ from what is nominal or measured: the error sources of yield and tolerance.
 * All 0 is a process without errors.
 */
export interface ProcessErrors {
  /** Standard deviation of the coupling ratio of every splitter, one independent of the other. */
  readonly sigma: number;
  /** The same for the splitter's angle a (coupling ratio sin^2 a), in radians. */
  readonly sigmaAngle: number;
  /** Shift of all coupling ratios. */
  readonly bias: number;
  /** Standard deviation of a shift that all splitters of a die share. */
  readonly biasSigma: number;
  /**
   * Correlation of the local errors (sigma, sigmaAngle) of any two splitters of a cell, from -1 to 1; from
   * -1/2 for cells of three, no two of which can be opposite to each other.
   */
  readonly pairCorrelation: number;
  /** Distance in cells over which the local errors' correlation falls to 1/e; 0 for none. */
  readonly correlationLength: number;
  /** Standard deviation of every phase that is set, in radians. */
  readonly phaseSigma: number;
  /**
   * Resolution of the phases: 2^bits steps over a shifter's range (a whole turn where it has none); 0 for
   * continuous phases.
   */
  readonly bits: number;
  /** Standard deviation of each splitter's loss in dB; losses stay at or above 0. */
  readonly lossSigmaDb: number;
  readonly distribution: ErrorDistribution;
}

/** A process without errors. */
export const NO_ERRORS: ProcessErrors = {
  sigma: 0,
  sigmaAngle: 0,
  bias: 0,
  biasSigma: 0,
  pairCorrelation: 0,
  correlationLength: 0,
  phaseSigma: 0,
  bits: 0,
  lossSigmaDb: 0,
  distribution: 'normal',
};

/** Phases in radians that a shifter can be set to, ends included. */
export type PhaseRange = readonly [low: number, high: number];

/**
 * A chip as the program works with it: every default filled in, losses as amplitude factors. Plain readonly
 * data.
 */
export interface Chip {
  readonly name: string;
  readonly note: string;
  readonly mesh: Mesh;
  readonly style: CellStyle;
  /**
   * False for a chip without the last column of N phases (or the first, for external phases at the output).
   */
  readonly portShifters: boolean;
  /**
   * Power that crosses, `style.splitters` per cell in cell order, a cell's as the light meets them; see
   * `ratiosOfCell`.
   */
  readonly couplingRatios: Float64Array;
  readonly loss: ChipLoss;
  /**
   * Amplitude factor of the splitters of each cell together, where splitters differ in loss; null:
   * loss.splitter for each of them.
   */
  readonly cellLoss: Float64Array | null;
  /** Range of every shifter without one of its own; null when the chip states none. */
  readonly shifterRange: PhaseRange | null;
  /** Own ranges by index (from 0) of the shifter. */
  readonly shifterRanges: ReadonlyMap<number, PhaseRange>;
  /** Own names by index (from 0) of the shifter. */
  readonly shifterNames: ReadonlyMap<number, string>;
  /** Names of the ports from the top, or null. */
  readonly portNames: readonly string[] | null;
  /** How chips of this kind differ from each other. */
  readonly process: ProcessErrors;
}

/**
 * True when the external phase stands behind the splitters; the free port phases are then at the mesh's
 * inputs.
 */
export function externalAtOutput(style: CellStyle): boolean {
  return style.external === 'upper-output' || style.external === 'lower-output';
}

import type { Mesh } from '../mesh/Mesh.js';
import type { ToleranceEstimate, ToleranceSearch } from '../tolerance/findTolerance.js';
import { findFewestBits, findOnLadder, findTolerance } from '../tolerance/findTolerance.js';
import type { Quantity } from './trialScenario.js';
import { QUANTITY_LABELS } from './yieldSweep.js';

/** How a quantity is searched for the value up to which a yield holds. Plain data. */
export type QuantitySearch =
  /** Taken to make chips worse as it grows; beginning at `from + start`, it goes up to `from + most`. */
  | { readonly kind: 'rising'; readonly from: number; readonly start: number; readonly most: number }
  /** Whole numbers from 1 to `most`, of which more are better. */
  | { readonly kind: 'fewest'; readonly most: number }
  /** Its growth may make chips better again: tried value by value, up to the first that fails. */
  | { readonly kind: 'ladder'; readonly rungs: readonly number[]; readonly whole: boolean };

function rising(start: number, most: number, from = 0): QuantitySearch {
  return { kind: 'rising', from, start, most };
}

/** A chip of one port has no cell, and nothing to fail. */
export const FEWEST_MODES = 2;
/** Numbers of ports, two for a factor of 2. */
const MODES_RUNGS = [FEWEST_MODES, 3, 4, 6, 8, 12, 16, 24, 32, 48, 64, 96, 128, 192, 256];

const SEARCHES: Readonly<Record<Exclude<Quantity, 'correlationLength'>, QuantitySearch>> = {
  sigma: rising(0.01, 0.5),
  sigmaAngle: rising(0.01, 0.8),
  bias: rising(0.01, 0.5),
  biasSigma: rising(0.01, 0.5),
  pairCorrelation: rising(0.1, 1),
  phaseSigma: rising(0.02, 3),
  bits: { kind: 'fewest', most: 24 },
  lossSigmaDb: rising(0.05, 20),
  modes: { kind: 'ladder', rungs: MODES_RUNGS, whole: true },
  couplingRatio: rising(0.01, 0.5, 0.5),
  lossDb: rising(0.05, 20),
};

const SHORTEST_LENGTH = 0.25;
/** The farthest cells are then correlated by 0.99: all splitters of a chip err alike. */
const LONGEST_PER_DISTANCE = 100;

/**
 * Correlation lengths in cells: 0, a quarter, and on in steps of a half and a third in turn (two for a factor
 * of 2), up to where errors are the same all over the chip. In between the yield may be lowest: of 8-port
 * chips with a sigma of 0.0205 and Haar-random targets 98.5 % keep a fidelity of 0.99 at a length of 0, 91 %
 * at 4, 80 % at 128 and 81 % at 1536.
 */
function lengthRungs({ columns, modes }: Mesh): number[] {
  const longest = LONGEST_PER_DISTANCE * (columns + modes / 2);
  const rungs = [0];
  for (let length = SHORTEST_LENGTH; rungs.at(-1)! < longest; length *= 2) {
    rungs.push(length, 1.5 * length);
  }
  return rungs;
}

/** The search of a quantity on chips of a mesh. */
export function searchOf(quantity: Quantity, mesh: Mesh): QuantitySearch {
  if (quantity !== 'correlationLength') return SEARCHES[quantity];
  return { kind: 'ladder', rungs: lengthRungs(mesh), whole: false };
}

/** A value of the search at which the quantity acts. */
export function exampleOf(search: QuantitySearch): number {
  if (search.kind === 'rising') return search.from + search.start;
  return search.kind === 'fewest' ? 1 : search.rungs.find((rung) => rung > 0)!;
}

/** The largest value that is tried. */
export function greatestOf(search: QuantitySearch): number {
  if (search.kind === 'rising') return search.from + search.most;
  return search.kind === 'fewest' ? search.most : search.rungs.at(-1)!;
}

/** Looks for the value. */
export function findBy(
  search: QuantitySearch,
  question: Pick<ToleranceSearch, 'yieldWanted' | 'confidence' | 'count'>,
): Promise<ToleranceEstimate> {
  if (search.kind === 'rising') return findTolerance({ ...search, ...question });
  if (search.kind === 'fewest') return findFewestBits({ ...search, ...question });
  return findOnLadder({ ...search, ...question });
}

/** What the value that is found means, for the report. */
export function meaningOf(quantity: Quantity, search: QuantitySearch): string {
  const label = QUANTITY_LABELS[quantity];
  if (search.kind === 'fewest') return `the fewest ${label} with which the yield holds`;
  if (search.kind === 'rising') {
    return `the largest ${label}, from ${search.from} up, for which the yield holds`;
  }
  const { rungs } = search;
  const ladder = `${rungs.slice(0, 4).join(', ')}, ... ${rungs.at(-1)}`;
  const sampling = quantity === 'modes' ? '; chips of each size are other chips' : '';
  return (
    `the largest ${label} up to which the yield holds at every value of the ladder ${ladder}; the step in which ` +
    `it is lost first is halved, and what lies beyond, where it may hold again, is not looked at${sampling}`
  );
}

/** The same when it holds nowhere, not even where the search begins. */
export function nowhereWords(quantity: Quantity, search: QuantitySearch): string {
  const { kind } = search;
  if (kind === 'fewest') return `the yield does not hold even with ${search.most} ${quantity}`;
  if (quantity === 'modes') return `the yield does not hold even with ${FEWEST_MODES} ports`;
  const first = kind === 'rising' ? search.from : search.rungs[0]!;
  return first === 0
    ? `the yield does not hold even without ${quantity}`
    : `the yield does not hold even at ${quantity} ${first}`;
}

import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { zeroMatrix } from '../matrix/ComplexMatrix.js';

/** The ports that may be exchanged: a lab can plug fibres anew on either side. */
export const REASSIGNED_SIDES = ['outputs', 'inputs', 'both'] as const;
/** The ports that may be exchanged. */
export type ReassignedSide = (typeof REASSIGNED_SIDES)[number];

/** Which port of the chip stands for which port of the target. All indices count from 0. */
export interface PortAssignment {
  /** The chip's output port at which the target's output port i leaves. */
  readonly outputs: readonly number[];
  /** The chip's input port at which the target's input port j enters. */
  readonly inputs: readonly number[];
}

/** What {@link reassignPorts} found. */
export interface Reassigned {
  readonly assignment: PortAssignment;
  /** The target as the chip's ports see it. */
  readonly target: ComplexMatrix;
  /** What the judge said before and after. */
  readonly before: number;
  readonly after: number;
}

/** How the search is limited. */
export interface ReassignOptions {
  /** Ends the search with the best so far when it returns true; asked before every trial of an exchange. */
  readonly enough?: () => boolean;
}

/** A gain below this is rounding: ports stay where they are. */
const LEAST_GAIN = 1e-12;

/** The assignment that leaves every port where it is. */
export function sameAssignment(modes: number): PortAssignment {
  const ports = Array.from({ length: modes }, (_, port) => port);
  return { outputs: ports, inputs: ports };
}

/** The target as the chip's ports see it: row i moved to outputs[i], column j to inputs[j]. */
export function assignedTarget(target: ComplexMatrix, { outputs, inputs }: PortAssignment): ComplexMatrix {
  const { rows, columns } = target;
  const moved = zeroMatrix(rows, columns);
  for (let i = 0; i < rows; i++) {
    for (let j = 0; j < columns; j++) {
      const to = outputs[i]! * columns + inputs[j]!;
      moved.re[to] = target.re[i * columns + j]!;
      moved.im[to] = target.im[i * columns + j]!;
    }
  }
  return moved;
}

/**
 * Looks for an assignment of the target's ports to those of the chip that the chip does better: exchanges two
 * ports as long as that gains something, the ports nearest to each other first, until no exchange does. That is
 * a local search: what it finds is never worse than the ports as they are, and no exchange of two ports is
 * better. One round costs N(N-1)/2 judgements a side.
 * @param judge how well the chip does a target as its ports see it (larger is better), such as the fidelity once
 * it is programmed
 */
export function reassignPorts(
  target: ComplexMatrix,
  side: ReassignedSide,
  judge: (target: ComplexMatrix, assignment: PortAssignment) => number,
  { enough = () => false }: ReassignOptions = {},
): Reassigned {
  const modes = target.rows;
  let assignment = sameAssignment(modes);
  let moved = target;
  const before = judge(target, assignment);
  let after = before;
  const sides = side === 'both' ? (['outputs', 'inputs'] as const) : [side];
  const exchanges = sides.flatMap((each) => pairsOfPorts(modes).map((pair) => ({ each, pair })));
  let idle = 0;
  for (let k = 0; idle < exchanges.length && !enough(); k = (k + 1) % exchanges.length) {
    const { each, pair } = exchanges[k]!;
    const tried = { ...assignment, [each]: exchanged(assignment[each], pair) };
    const asSeen = assignedTarget(target, tried);
    const value = judge(asSeen, tried);
    if (value > after + LEAST_GAIN) {
      [assignment, moved, after] = [tried, asSeen, value];
      idle = 0;
    } else {
      idle++;
    }
  }
  return { assignment, target: moved, before, after };
}

/** All pairs of ports, neighbours first. */
function pairsOfPorts(modes: number): (readonly [number, number])[] {
  const pairs: [number, number][] = [];
  for (let apart = 1; apart < modes; apart++) {
    for (let port = 0; port + apart < modes; port++) pairs.push([port, port + apart]);
  }
  return pairs;
}

function exchanged(ports: readonly number[], [one, other]: readonly [number, number]): number[] {
  return ports.map((port) => (port === one ? other : port === other ? one : port));
}

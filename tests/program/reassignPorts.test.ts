import { describe, expect, it } from 'vitest';
import type { ComplexMatrix } from '../../src/matrix/ComplexMatrix.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import { adjoint, multiply } from '../../src/matrix/products.js';
import type { PortAssignment } from '../../src/program/reassignPorts.js';
import { assignedTarget, reassignPorts, sameAssignment } from '../../src/program/reassignPorts.js';
import { maxDifference, permutation } from '../support/matrices.js';

const target = haarUnitary(5, 3);
/** Light that enters port j leaves at port ports[j] (from 0). */
const moving = (ports: readonly number[]): ComplexMatrix => permutation(ports);

describe('a target with its ports assigned', () => {
  // Plugging fibres is a permutation on either side: P_out U P_in^T, in the project's convention for
  // permutations.
  it('is the target between two permutations', () => {
    const assignment: PortAssignment = { outputs: [2, 0, 1, 4, 3], inputs: [1, 4, 0, 3, 2] };
    const expected = multiply(
      multiply(moving(assignment.outputs), target),
      adjoint(moving(assignment.inputs)),
    );
    expect(maxDifference(assignedTarget(target, assignment), expected)).toBe(0);
  });
});

describe('the search for an assignment', () => {
  it('undoes an exchange of ports on the side that may change', () => {
    // Of all assignments the judge likes the target as it was best, by how many entries stand right.
    const judge = (seen: typeof target): number => -maxDifference(seen, target);
    for (const side of ['outputs', 'inputs'] as const) {
      const swapped = { ...sameAssignment(5), [side]: [0, 3, 2, 1, 4] };
      const found = reassignPorts(assignedTarget(target, swapped), side, judge);
      expect(found.assignment).toEqual(swapped);
      expect(found.after).toBeCloseTo(0, 15);
      expect(found.before).toBeLessThan(0);
      expect(maxDifference(found.target, target)).toBe(0);
    }
  });

  it('leaves ports that nothing is gained by, and is never worse', () => {
    const flat = reassignPorts(target, 'both', () => 0.7);
    expect(flat.assignment).toEqual(sameAssignment(5));
    const rough = reassignPorts(target, 'both', (seen) => seen.re[7]! - seen.im[3]!);
    expect(rough.after).toBeGreaterThanOrEqual(rough.before);
    // No exchange of two outputs is better than what was found.
    for (let one = 0; one < 5; one++) {
      for (let other = 0; other < one; other++) {
        const outputs = rough.assignment.outputs.map((port) =>
          port === one ? other : port === other ? one : port,
        );
        const seen = assignedTarget(target, { ...rough.assignment, outputs });
        expect(seen.re[7]! - seen.im[3]!).toBeLessThanOrEqual(rough.after + 1e-12);
      }
    }
  });

  it('ends when it is told, with what it has', () => {
    let asked = 0;
    const found = reassignPorts(target, 'outputs', (seen) => seen.re[0]!, { enough: () => ++asked > 3 });
    expect(asked).toBe(4);
    expect(found.after).toBeGreaterThanOrEqual(found.before);
  });
});

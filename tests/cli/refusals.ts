import { beforeAll, describe, expect, it } from 'vitest';
import type { CommandRun } from './runCommand.js';
import { runMany } from './runCommand.js';

/** A command that must be refused: what the first line must tell, and what the second. */
export interface Refusal {
  readonly args: readonly string[];
  readonly files?: Readonly<Record<string, string | Uint8Array>>;
  readonly says: RegExp;
  readonly mends: RegExp;
}

/** Runs all of them: exit code 2, two lines on standard error, and nothing written. */
export function describeRefusals(title: string, refusals: readonly Refusal[]): void {
  describe(title, () => {
    let runs: readonly CommandRun[];
    beforeAll(async () => {
      runs = await runMany(refusals.map(({ args, files }) => ({ args, files })));
    });

    it.each(refusals.map((refusal, k) => ({ ...refusal, name: refusal.args.join(' '), k })))(
      '$k: $name',
      ({ says, mends, files, k }) => {
        const { code, stdout, stderr, listing } = runs[k]!;
        expect([code, stdout]).toEqual([2, '']);
        const lines = stderr.trimEnd().split('\n');
        expect(lines).toHaveLength(2);
        expect(lines[0]).toMatch(says);
        expect(lines[0]).toMatch(/^error: /);
        expect(lines[1]).toMatch(mends);
        // No new folder of results, and nothing else either.
        expect(listing).toEqual(Object.keys(files ?? {}));
      },
    );
  });
}

import { describe, expect, it } from 'vitest';
import { asRecord, runCommand } from './runCommand.js';

interface TheoryReport {
  readonly theory: { readonly meanInfidelity: number | null };
  readonly fidelity: { readonly mean: number; readonly standardError: number };
  readonly yield: { readonly share: number; readonly thresholds: readonly { readonly key: string }[] };
}

async function yieldOf(
  args: readonly string[],
  chip?: string,
): Promise<{ report: TheoryReport; stderr: string }> {
  const files = chip === undefined ? {} : { 'c.chip.json': chip };
  const options = chip === undefined ? [] : ['--chip', 'c.chip.json'];
  const run = await runCommand(['yield', ...args, ...options, '--json'], { files });
  expect(run.code, run.stderr).toBe(0);
  return { report: asRecord(run.stdout) as unknown as TheoryReport, stderr: run.stderr };
}

describe.concurrent('the theory beside the simulation', () => {
  // E[1-F] = L (1 - c L), conventions of small errors: see tests/tolerance/theory.test.ts.
  it('agrees on a flawless chip with Haar targets, and says nothing', async () => {
    const { report, stderr } = await yieldOf(['haar(8)', '--sigma', '0.02', '--trials', '4000']);
    const { mean, standardError } = report.fidelity;
    const off = Math.abs(1 - mean - report.theory.meanInfidelity!);
    expect(off).toBeLessThan(4 * standardError + 1e-5);
    expect(stderr).not.toContain('theory');
  });

  it('counts what the chip itself lacks for one target, and is silent for Haar targets on such a chip', async () => {
    const chip = '{"modes": 8, "couplingRatio": 0.4, "lossDb": {"output": [0, 1, 0, 2, 0, 1, 0, 2]}}';
    const one = await yieldOf(['haar(8, 1)', '--sigma', '0.01', '--trials', '2000'], chip);
    const { mean, standardError } = one.report.fidelity;
    expect(mean).toBeLessThan(0.995);
    const off = Math.abs(1 - mean - one.report.theory.meanInfidelity!);
    // Losses and errors act together to second order: their product is left out.
    expect(off).toBeLessThan(4 * standardError + 2 * (1 - mean) * 0.0015);
    const many = await yieldOf(['haar(8)', '--sigma', '0.01', '--trials', '200'], chip);
    expect(many.report.theory.meanInfidelity).toBeNull();
  });

  it('is left out where the errors are too large for it, and says so', async () => {
    for (const sigma of ['0.5', '1', '3']) {
      const { report, stderr } = await yieldOf(['haar(4)', '--sigma', sigma, '--trials', '100']);
      expect(report.theory.meanInfidelity).toBeNull();
      expect(stderr).toContain('the errors are too large for the small-error theory');
    }
  });
});

it('judges a chip without port shifters by what it can do', async () => {
  const chip = '{"modes": 4, "portShifters": false}';
  const { report } = await yieldOf(['dft(4)', '--sigma', '0.01', '--trials', '500'], chip);
  expect(report.yield.thresholds).toEqual([{ key: 'portPhaseFreeFidelity', limit: 0.99 }]);
  expect(report.yield.share).toBeGreaterThan(0.99);
  expect(report.theory.meanInfidelity).toBeNull();
});

it('refuses a chip through which no light comes, in two lines', async () => {
  const files = { 'dark.chip.json': '{"modes": 32, "lossDb": {"splitter": 500}}' };
  const run = await runCommand(
    ['yield', 'haar(32)', '--chip', 'dark.chip.json', '--sigma', '0.01', '--threshold', 'transmissionDb=-10'],
    { files },
  );
  expect(run.code).toBe(2);
  expect(run.stderr).toMatch(
    /^error: trial 1 has no .*no light comes through the chip\nLook at the losses.*\n$/,
  );
});

import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { asRecord, freshFolder, runCommand } from './runCommand.js';
import { chunksIn, readTable, resultsIn, stopCommand } from './yieldRuns.js';

const BASE = ['yield', 'haar(6)', '--sigma', '0.06', '--trials', '30'];

describe.concurrent('yield with chips retuned through the mesh and refined', () => {
  it('has every chip at least as good as with less effort', async () => {
    const folder = freshFolder();
    const found = await Promise.all(
      ['cell', 'mesh', 'refine'].map(async (retune) => {
        const run = await runCommand([...BASE, '--retune', retune, '--quiet', '--out', retune], { folder });
        expect([run.code, run.stderr]).toEqual([0, '']);
        return (await readTable(join(folder, retune, 'trials.npy'))).values;
      }),
    );
    const [cell, mesh, refine] = found;
    cell!.forEach((fidelity, k) => {
      expect(mesh![k]!).toBeGreaterThan(fidelity - 1e-13);
      expect(refine![k]!).toBeGreaterThan(mesh![k]! - 1e-13);
    });
  });

  it('says in the report what was refined for, and within which limits; a limit of time aloud', async () => {
    const args = [...BASE, '--retune', 'refine', '--threshold', 'powerDistance=0.01', '--json'];
    const free = await runCommand([...args, '--refine-iterations', '30']);
    expect(asRecord(free.stdout)).toMatchObject({
      retune: 'refine',
      refine: { figure: 'powerDistance', mostIterations: 30 },
      theory: { meanInfidelity: null },
    });
    expect(free.stderr).not.toMatch(/machine/);
    const limited = await runCommand([...args, '--refine-seconds', '1e-9']);
    expect(asRecord(limited.stdout)['refine']).toEqual({
      ...{ figure: 'powerDistance', mostIterations: 200, mostSeconds: 1e-9 },
      ...{ outOfTime: 30, dependsOnMachine: true },
    });
    expect(limited.stderr).toMatch(
      /^note: results depend on the machine where --refine-seconds 1e-9 runs out: it did in 30 of 30 trials$/m,
    );
    const generous = await runCommand([...args, '--refine-seconds', '3600']);
    expect(asRecord(generous.stdout)['refine']).toMatchObject({ outOfTime: 0, dependsOnMachine: false });
    expect(generous.stderr).toMatch(/it did in 0 of 30 trials$/m);
  });

  it('goes with --sweep, --budget and --trial, and with tolerance', async () => {
    const folder = freshFolder();
    const run = async (...args: string[]): Promise<Record<string, unknown>> => {
      const { code, stdout, stderr } = await runCommand([...args, '--trials', '12', '--json'], { folder });
      expect(code, stderr).toBe(0);
      return asRecord(stdout);
    };
    const refine = ['--retune', 'refine', '--refine-iterations', '20'];
    const sweep = await run('yield', 'haar(N)', '--sweep', 'modes=2:4:3', '--sigma', '0.1', ...refine);
    const means = (sweep['sweep'] as { fidelity: { mean: number } }[]).map(({ fidelity }) => fidelity.mean);
    expect(means).toHaveLength(3);
    means.forEach((mean) => expect(mean).toBeGreaterThan(0.98));
    expect(sweep['refine']).toEqual({ figure: 'fidelity', mostIterations: 20 });
    const budget = await run(
      ...['yield', 'dft(4)', '--sigma', '0.03', '--error', 'bits=8', '--budget'],
      ...refine,
    );
    const costs = budget['budget'] as { source: string; alone: { infidelity: { mean: number } } }[];
    // All cells of the Fourier transform are in reach, so that splitters cost nothing; resolution is all
    // there is.
    expect(costs.map(({ source }) => source)).toEqual(['bits', 'sigma']);
    expect(Math.abs(costs[1]!.alone.infidelity.mean)).toBeLessThan(1e-12);
    const seventh = [...BASE, ...refine, '--out', 'one'];
    const one = await run(...seventh, '--trial', '7');
    const all = await runCommand([...BASE, ...refine, '--out', 'all', '--quiet'], { folder });
    expect(all.code).toBe(0);
    const { values } = await readTable(join(folder, 'all', 'trials.npy'));
    expect((one['merit'] as { fidelity: number }).fidelity).toBeCloseTo(values[6]!, 12);
    const tolerance = await run('tolerance', 'haar(3)', '--retune', 'mesh');
    expect((tolerance['tolerance'] as { value: number }).value).toBeGreaterThan(0.05);
  });

  it('writes the same bytes for 1 and 2 workers and after a resume', async () => {
    const args = [
      'yield',
      'haar(12)',
      '--sigma',
      '0.05',
      '--retune',
      'refine',
      '--trials',
      '47',
      '--out',
      'r',
    ];
    const whole = await Promise.all(
      ['1', '2'].map(async (workers) => {
        const { folder, code } = await runCommand([...args, '--quiet', '--workers', workers]);
        expect(code).toBe(0);
        return resultsIn(join(folder, 'r'));
      }),
    );
    expect(whole[1]).toEqual(whole[0]);
    const folder = freshFolder();
    const results = join(folder, 'r');
    await stopCommand(args, folder, 'SIGKILL', () => chunksIn(results) >= 2);
    expect(chunksIn(results)).toBeGreaterThanOrEqual(2);
    const other = await runCommand([...args, '--resume', '--refine-iterations', '100'], { folder });
    expect(other.code).toBe(2);
    expect(other.stderr).toMatch(/refineIterations was 200 and is 100/);
    const resumed = await runCommand([...args, '--resume', '--quiet'], { folder });
    expect([resumed.code, resumed.stderr]).toEqual([0, '']);
    expect(await resultsIn(results)).toEqual(whole[0]);
  });
});

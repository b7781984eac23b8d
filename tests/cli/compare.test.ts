import { readFile } from 'node:fs/promises';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { named } from '../figure/figureParts.js';
import { readXml } from '../figure/readXml.js';
import { describeRefusals } from './refusals.js';
import type { Refusal } from './refusals.js';
import { freshFolder, runCommand } from './runCommand.js';
import { chunksIn, resultsIn, stopCommand } from './yieldRuns.js';

interface Mean {
  readonly mean: number;
  readonly standardError: number;
}

interface Row {
  readonly layout: string;
  readonly splitters: number;
  readonly retune: string;
  readonly fidelity: Mean;
  readonly portPhaseFreeFidelity?: Mean;
  readonly gain?: Mean & { readonly over: string };
  readonly yield: number;
  readonly yieldInterval: readonly [number, number];
  readonly passed: number;
  readonly trials: number;
  readonly columns: number;
  readonly splitterCount: number;
  readonly shifterCount: number;
  readonly cellsPassed: { readonly fewest: number; readonly most: number };
  readonly transmissionDb: number;
}

interface Report {
  readonly rows: readonly Row[];
  readonly chip: { readonly leftOut: readonly string[] };
  readonly refine?: Record<string, unknown>;
  readonly interrupted?: boolean;
  readonly files: readonly string[];
}

const reportOf = (text: string): Report => JSON.parse(text) as Report;
const TWO_SPLITTERS = ['--splitters', '2'];
const SMALL = ['compare', 'haar(5)', '--sigma', '0.06', '--trials', '60', ...TWO_SPLITTERS, '--out', 'r'];

/** A chip with losses of columns alone, and with what belongs to single cells. */
const CHIP = JSON.stringify({
  modes: 4,
  name: 'pier-4',
  lossDb: { column: 0.1 },
  measuredCells: [{ cell: 1, couplingRatio: [0.2, 0.9] }],
  shifterOverrides: [{ shifter: 1, name: 'H1', rangeRad: [0, 1] }],
  process: { sigma: 0.03 },
});

describe.concurrent('compare', () => {
  it('reports what the contract names, layouts by retunings, and sizes as they are known', async () => {
    const run = await runCommand([...SMALL, '--json', '--quiet']);
    expect([run.code, run.stderr]).toEqual([0, '']);
    expect(run.stdout).toBe(await run.read('r/report.json'));
    const { rows, ...report } = reportOf(run.stdout);
    expect(Object.keys(report)).toEqual([
      ...['version', 'runId', 'command', 'target', 'chip', 'errors', 'refine', 'thresholds', 'confidence'],
      ...['seed', 'seconds', 'trialsPerSecond', 'files'],
    ]);
    expect(report).toMatchObject({
      command: 'compare',
      files: ['compare.csv', 'compare.svg', 'report.json'],
      refine: { figure: 'fidelity', mostIterations: 200 },
    });
    expect(rows.map(({ layout, splitters, retune }) => [layout, splitters, retune])).toEqual(
      ['rectangular', 'triangular'].flatMap((layout) =>
        ['none', 'cell', 'mesh', 'refine'].map((retune) => [layout, 2, retune]),
      ),
    );
    for (const row of rows) {
      expect(row).toMatchObject({ trials: 60, splitterCount: 20, shifterCount: 25 });
      // Clements et al. 2016 and Reck et al. 1994: N columns, and 2N - 3.
      expect(row.columns).toBe(row.layout === 'rectangular' ? 5 : 7);
      expect(row.cellsPassed).toEqual(
        row.layout === 'rectangular' ? { fewest: 2, most: 5 } : { fewest: 1, most: 7 },
      );
      expect(row.yield).toBe(row.passed / 60);
      expect(row.yieldInterval[0]).toBeLessThanOrEqual(row.yield);
      expect(row.yieldInterval[1]).toBeGreaterThanOrEqual(row.yield);
      expect(row.transmissionDb).toBeCloseTo(0, 12);
    }
  });

  it('shows none < cell < mesh < refine, and what each wins over the one before on the same chips', async () => {
    const { rows } = reportOf((await runCommand([...SMALL, '--json'])).stdout);
    for (const layout of ['rectangular', 'triangular']) {
      const means = rows.filter((row) => row.layout === layout);
      means.slice(1).forEach(({ fidelity, gain, retune }, k) => {
        expect(fidelity.mean, retune).toBeGreaterThan(means[k]!.fidelity.mean);
        expect(gain!.over).toBe(means[k]!.retune);
        expect(gain!.mean).toBeCloseTo(fidelity.mean - means[k]!.fidelity.mean, 12);
      });
      expect(means[0]!.gain).toBeUndefined();
      // That cells are corrected is known far better than by the spread of either.
      expect(means[1]!.gain!.mean).toBeGreaterThan(4 * means[1]!.gain!.standardError);
    }
  });

  it('has in each row what yield finds', async () => {
    const { folder, stdout } = await runCommand([...SMALL, '--json', '--threshold', 'fidelity=0.999']);
    const rows = reportOf(stdout).rows.filter(({ layout }) => layout === 'triangular');
    for (const row of rows) {
      const args = ['--layout', 'triangular', '--retune', row.retune, '--threshold', 'fidelity=0.999'];
      const found = await runCommand(
        ['yield', 'haar(5)', '--sigma', '0.06', '--trials', '60', ...args, '--json', '--out', row.retune],
        { folder },
      );
      const { fidelity, yield: share } = JSON.parse(found.stdout) as {
        fidelity: Mean;
        yield: { share: number; low: number; high: number };
      };
      expect([row.fidelity.mean, row.fidelity.standardError]).toEqual([
        fidelity.mean,
        fidelity.standardError,
      ]);
      expect([row.yield, ...row.yieldInterval]).toEqual([share.share, share.low, share.high]);
    }
  });

  it('prints a table, and writes the same as CSV and in the figure', async () => {
    const run = await runCommand([...SMALL, '--retunes', 'refine,none']);
    expect(run.stdout).toMatch(/^haar\(5\) on ideal chips of 5 ports: .* fidelity ≥ 0\.99, seed 2026$/m);
    const { rows } = reportOf(await run.read('r/report.json'));
    expect(rows.map(({ retune }) => retune)).toEqual(['none', 'refine', 'none', 'refine']);
    const [header, ...lines] = (await run.read('r/compare.csv')).trimEnd().split('\n');
    const names = header!.split(',');
    expect(lines).toHaveLength(4);
    lines.forEach((line, k) => {
      const fields = line.split(',');
      const field = (name: string): string => fields[names.indexOf(name)]!;
      const row = rows[k]!;
      expect([field('layout'), field('retune')]).toEqual([row.layout, row.retune]);
      expect([field('fidelityMean'), field('yield'), field('columns')].map(Number)).toEqual([
        row.fidelity.mean,
        row.yield,
        row.columns,
      ]);
    });
    for (const { layout, retune } of rows)
      expect(run.stdout).toMatch(new RegExp(`^${layout} +2 +${retune} `, 'm'));
    const texts = named(readXml(await run.read('r/compare.svg')), 'text').map(({ text }) => text);
    expect(texts.filter((text) => text === 'refine')).toHaveLength(2);
    expect(texts).toContain('chips with fidelity ≥ 0.99');
    expect(texts).toContain('target: haar(5); 60 chips a row');
    expect(run.stderr).toBe('written to r: compare.csv, compare.svg, report.json\n');
  });

  it('keeps style, losses and process of a chip file, and what belongs to single cells for its own layout only', async () => {
    const files = { 'c.chip.json': CHIP };
    const args = ['compare', 'dft(4)', '--chip', 'c.chip.json', '--trials', '40', ...TWO_SPLITTERS, '--json'];
    const both = await runCommand(args, { files });
    expect(both.stderr).toMatch(/^note: measuredCells and shifterOverrides .* are left out in all rows$/m);
    const all = reportOf(both.stdout);
    expect(all.chip.leftOut).toEqual(['measuredCells', 'shifterOverrides']);
    // A tenth of a dB in each column, on all ports alike.
    for (const { columns, transmissionDb } of all.rows) expect(transmissionDb).toBeCloseTo(-0.1 * columns, 9);
    const own = await runCommand([...args, '--layouts', 'rectangular'], { files });
    expect(own.stderr).not.toMatch(/left out/);
    expect(reportOf(own.stdout).chip.leftOut).toEqual([]);
    const of = (report: Report, retune: string): number =>
      report.rows.find((row) => row.layout === 'rectangular' && row.retune === retune)!.fidelity.mean;
    // A cell that can hardly cross spoils the Fourier transform, whose first cell must share evenly.
    expect(of(reportOf(own.stdout), 'cell')).toBeLessThan(of(all, 'cell') - 0.01);
    expect(own.stdout).not.toMatch(/triangular/);
  });

  it('judges chips without port shifters by the port-phase-free fidelity, and refines for it', async () => {
    const files = { 'c.chip.json': '{"modes": 4, "portShifters": false, "process": {"sigma": 0.06}}' };
    const args = [
      'compare',
      'haar(4)',
      '--chip',
      'c.chip.json',
      '--trials',
      '40',
      ...TWO_SPLITTERS,
      '--json',
    ];
    const { rows, refine } = reportOf((await runCommand(args, { files })).stdout);
    expect(refine).toMatchObject({ figure: 'portPhaseFreeFidelity' });
    for (const layout of ['rectangular', 'triangular']) {
      const means = rows.filter((row) => row.layout === layout).map((row) => row.portPhaseFreeFidelity!.mean);
      for (let k = 1; k < means.length; k++) expect(means[k]).toBeGreaterThan(means[k - 1]! - 1e-12);
      expect(means[3]).toBeGreaterThan(0.99);
    }
    expect(rows[0]!.shifterCount).toBe(12);
  });

  it('samples fewer chips where it would take long and no number is given, and says so', async () => {
    const args = ['compare', 'haar(3)', '--sigma', '0.05', '--layouts', 'triangular', ...TWO_SPLITTERS];
    const run = await runCommand([...args, '--refine-iterations', '1000000', '--json', '--out', 'r']);
    const { rows } = reportOf(run.stdout);
    expect(rows.map(({ trials }) => trials).slice(0, 3)).toEqual([1000, 1000, 1000]);
    expect(rows[3]!.trials).toBeLessThan(1000);
    expect(rows[3]!.trials).toBeGreaterThanOrEqual(50);
    expect(run.stderr).toMatch(/^1 row of long trials has fewer of them, at least \d+: give --trials /m);
  });

  it('says that results depend on the machine when a refinement is limited in time', async () => {
    const args = [...SMALL, '--refine-seconds', '1e-9', '--layouts', 'rectangular', '--json'];
    const run = await runCommand(args);
    expect(run.stderr).toMatch(/^note: results depend on the machine .*: it did in 60 of 60 trials$/m);
    expect(reportOf(run.stdout).refine).toEqual({
      figure: 'fidelity',
      mostIterations: 200,
      mostSeconds: 1e-9,
      outOfTime: 60,
      dependsOnMachine: true,
    });
  });
});

describe('compare, the same bytes', () => {
  const FEW_ROWS = ['--retunes', 'mesh,refine', '--layouts', 'triangular', ...TWO_SPLITTERS];
  const LONG = ['compare', 'haar(12)', '--sigma', '0.05', '--trials', '160', ...FEW_ROWS, '--out', 'r'];

  it('for 1 and 2 workers, and after Ctrl-C, which leaves the rows so far, and a resume', async () => {
    const whole = await Promise.all(
      ['1', '2'].map(async (workers) => {
        const { folder, code } = await runCommand([...LONG, '--quiet', '--workers', workers]);
        expect(code).toBe(0);
        return resultsIn(join(folder, 'r'));
      }),
    );
    expect(whole[1]).toEqual(whole[0]);
    const folder = freshFolder();
    const results = join(folder, 'r');
    const stopped = await stopCommand(LONG, folder, 'SIGINT', () => chunksIn(results) >= 3);
    expect(stopped.code).toBe(130);
    expect(stopped.stderr).toMatch(/interrupted after \d+ of 320 trials; go on with --resume/);
    const part = reportOf(await readFile(join(results, 'report.json'), 'utf8'));
    expect(part.interrupted).toBe(true);
    const done = part.rows.reduce((sum, { trials }) => sum + trials, 0);
    expect(done).toBeGreaterThan(0);
    expect(done).toBeLessThan(320);
    const resumed = await runCommand([...LONG, '--resume', '--quiet'], { folder });
    expect([resumed.code, resumed.stderr]).toEqual([0, '']);
    expect(await resultsIn(results)).toEqual(whole[0]);
  });
});

const DFT = ['compare', 'dft(3)', '--sigma', '0.02'];
const FAULTS: readonly Refusal[] = [
  { args: ['compare', 'dft(3)'], says: /nothing makes the chips differ/, mends: /--sigma 0\.02/ },
  { args: ['compare'], says: /missing required argument/, mends: /help compare/ },
  { args: [...DFT, '--layouts', 'square'], says: /there is no square/, mends: /rectangular,triangular/ },
  { args: [...DFT, '--layouts', 'triangula'], says: /no triangula/, mends: /Did you mean triangular\?/ },
  { args: [...DFT, '--layouts', ''], says: /no word between the commas/, mends: /rectangular,triangular/ },
  { args: [...DFT, '--retunes', 'cell,mash'], says: /there is no mash/, mends: /Did you mean mesh\?/ },
  {
    args: [...DFT, '--retunes', 'cell,'],
    says: /no word between the commas/,
    mends: /none,cell,mesh,refine/,
  },
  { args: [...DFT, '--splitters', '7'], says: /there is no 7/, mends: /Choose from 2/ },
  { args: [...DFT, '--layout', 'triangular'], says: /--layout/, mends: /--layouts/ },
  { args: [...DFT, '--retune', 'cell'], says: /--retune/, mends: /--retunes/ },
  { args: [...DFT, '--trials', '0'], says: /--trials 0/, mends: /from 1 to/ },
  { args: [...DFT, '--refine-iterations', '0'], says: /--refine-iterations 0/, mends: /from 1 to/ },
  { args: [...DFT, '--refine-seconds', '0'], says: /--refine-seconds 0/, mends: /Write a number/ },
  {
    args: [...DFT, '--retunes', 'none,mesh', '--refine-iterations', '9'],
    says: /--refine-iterations goes with the retuning refine only/,
    mends: /refine/,
  },
  { args: [...DFT, '--threshold', 'fidelty=0.9'], says: /no figure of merit fidelty/, mends: /fidelity\?/ },
  { args: [...DFT, '--error', 'bits=99'], says: /bits is 99/, mends: /./ },
  {
    args: ['compare', 'haar(N)', '--sigma', '0.02'],
    says: /ports N of haar\(N\) is not known/,
    mends: /--chip/,
  },
  { args: [...DFT, '--trials', '100000000'], says: /more than memory holds/, mends: /fewer --trials/ },
  { args: [...DFT, '--workers', '0'], says: /0 is not a sensible number/, mends: /from 1 to/ },
  { args: [...DFT, '--out', '/dev/null/x'], says: /dev\/null/, mends: /another place/ },
  {
    args: [...DFT, '--chip', 'c.chip.json'],
    files: { 'c.chip.json': '{"modes": 2}' },
    says: /./,
    mends: /./,
  },
  {
    args: ['yield', 'dft(3)', '--sigma', '0.02', '--refine-seconds', '1'],
    says: /--refine-seconds goes with the retuning refine only/,
    mends: /--retune refine/,
  },
];

describeRefusals('compare refuses, with a line that says what and one that mends', FAULTS);

import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { freshFolder, meritOf, runCommand, runMany } from './runCommand.js';
import { readTable } from './yieldRuns.js';

describe.concurrent('yield --trial', () => {
  const CASES: readonly (readonly [name: string, chip: unknown, options: readonly string[]])[] = [
    [
      'every error source, losses, no port shifters',
      {
        modes: 4,
        portShifters: false,
        cellStyle: { internal: 'differential', external: 'upper-output' },
        measuredCells: [{ cell: 3, couplingRatio: [0.45, 0.51], lossDb: [0.1, 0.2] }],
        lossDb: { splitter: 0.05, shifter: 0.1, input: 1 },
        process: {
          ...{ sigma: 0.02, sigmaAngle: 0.01, bias: 0.01, biasSigma: 0.01, pairCorrelation: 0.5 },
          ...{ correlationLength: 2, phaseSigma: 0.05, bits: 8, lossSigmaDb: 0.05 },
        },
      },
      ['--retune', 'cell'],
    ],
    [
      'cells of three splitters with losses of their own',
      {
        modes: 4,
        cellStyle: { internal: 'lower', external: 'lower-output', splitters: 3 },
        measuredCells: [{ cell: 3, couplingRatio: [0.45, 0.51, 0.48], lossDb: [0.1, 0.2, 0.3] }],
        lossDb: { splitter: 0.05, shifter: 0.1 },
        process: { sigma: 0.02, pairCorrelation: -0.3, phaseSigma: 0.01, lossSigmaDb: 0.05 },
      },
      ['--retune', 'cell'],
    ],
    [
      'phases that errors carry out of the limits of their shifters',
      {
        modes: 4,
        shifterLimits: { rangeRad: [0, 2.5] },
        shifterOverrides: [{ shifter: 2, name: 'H2', rangeRad: [0, 6] }],
        process: { sigma: 0.02, phaseSigma: 0.3 },
      },
      [],
    ],
  ];
  it.each(CASES)(
    'writes a chip and phases that verify finds as good as the trial: %s',
    async (_, chip, options) => {
      const folder = freshFolder();
      const files = { 'c.chip.json': JSON.stringify(chip) };
      const figures = ['fidelity', 'powerDistance', 'transmission'];
      const args = ['yield', 'haar(4)', '--chip', 'c.chip.json', ...options, '--quiet'].concat(
        ...['fidelity=0.9', 'powerDistance=0.1', 'transmission=0.1'].map((limit) => ['--threshold', limit]),
      );
      await runCommand([...args, '--trials', '5', '--out', 'all'], { folder, files });
      const { values } = await readTable(join(folder, 'all/trials.npy'));
      for (const number of [2, 5]) {
        const out = `t${number}`;
        const replay = await runCommand([...args, '--trial', String(number), '--out', out], { folder });
        expect([replay.code, replay.listing.filter((name) => name.startsWith(`${out}/`))]).toEqual([
          0,
          [
            `${out}/`,
            `${out}/phases.csv`,
            `${out}/phases.json`,
            `${out}/report.json`,
            `${out}/trial-${number}.chip.json`,
          ],
        ]);
        const verified = await runCommand(
          [
            'verify',
            `${out}/phases.csv`,
            '--chip',
            `${out}/trial-${number}.chip.json`,
            '--json',
            '--quiet',
            '--out',
            `v${number}`,
          ],
          { folder },
        );
        expect([verified.code, verified.stderr]).toEqual([0, '']);
        figures.forEach((key, k) => {
          const row = values[(number - 1) * 3 + k]!;
          expect(meritOf(verified.stdout)[key]).toBeCloseTo(row, 12);
          expect(meritOf(readFileSync(join(folder, out, 'report.json'), 'utf8'))[key]).toBeCloseTo(row, 12);
        });
      }
    },
  );
});

describe('yield and tolerance, help', () => {
  it('names every option, error source and quantity', async () => {
    const help = ['yield', 'tolerance'].map((name) => ({ args: ['help', name], files: {} }));
    const [yieldHelp, toleranceHelp] = await runMany(help);
    const sources = ['sigma', 'sigmaAngle', 'bias', 'biasSigma', 'phaseSigma', 'lossSigmaDb'];
    const all = [
      ...sources,
      'pairCorrelation',
      'correlationLength',
      'bits',
      'modes',
      'couplingRatio',
      'lossDb',
    ];
    const common = ['--trials', '--threshold', '--confidence', '--retune', '--sigma', '--error', '--seed'];
    const own = ['--within', '--resume', '--trial ', '--sweep', '--budget', '--workers', 'default: 10000'];
    for (const word of [...all, ...common, ...own]) expect(yieldHelp!.stdout).toContain(word);
    for (const word of [...all, ...common, '--source', '--yield', '--workers', '--resume']) {
      expect(toleranceHelp!.stdout).toContain(word);
    }
  });
});

import { describe, expect, it } from 'vitest';
import type { CommandRun } from './runCommand.js';
import { asRecord, freshFolder, meritOf, runCommand } from './runCommand.js';

/** The table of dft(3), in `t/`, with its JSON beside it. */
async function withTable(folder = freshFolder()): Promise<CommandRun> {
  return runCommand(['phases', 'dft(3)', '--out', 't', '--quiet'], { folder });
}

describe.concurrent('verify', () => {
  it('finds that a table does its target, from either kind, and prints the report with --json', async () => {
    const { folder } = await withTable();
    for (const name of ['phases.csv', 'phases.json']) {
      const run = await runCommand(['verify', `t/${name}`, '--json', '--out', name], { folder });
      expect([run.code, run.stdout]).toEqual([0, await run.read(`${name}/report.json`)]);
      const report = asRecord(run.stdout);
      expect(Object.keys(report)).toEqual([
        ...['version', 'runId', 'command', 'table', 'target', 'chip', 'merit', 'outOfReach', 'outOfRange'],
        ...['missingPortPhases', 'requirements', 'files'],
      ]);
      expect(report).toMatchObject({
        command: 'verify',
        target: { source: 'dft(3)', modes: 3, nearestDistance: null },
        outOfReach: [],
        outOfRange: [],
        missingPortPhases: [],
        files: ['report.json'],
      });
      expect(meritOf(run.stdout)['fidelity']).toBeCloseTo(1, 12);
    }
  });

  it('lets the phases of an edited CSV win over those of the JSON beside it', async () => {
    const table = await withTable();
    const lines = (await table.read('t/phases.csv')).split('\n');
    // Output phase of port 1 half a turn on: each row of a unitary gives a third to Tr(U^dagger U)/3, so F =
    // (1 - 2/3)^2.
    const output = lines.findIndex((line) => line.startsWith('7,,output'));
    const fields = lines[output]!.split(',');
    lines[output] = [...fields.slice(0, 5), Number(fields[5]) + Math.PI, ''].join(',');
    const run = await runCommand(['verify', 't/phases.csv', '--json', '--quiet'], {
      folder: table.folder,
      files: { 't/phases.csv': lines.join('\n') },
    });
    const { fidelity, portPhaseFreeFidelity, powerDistance } = meritOf(run.stdout);
    expect(fidelity).toBeCloseTo(1 / 9, 12);
    // Detectors of power see no difference.
    expect(portPhaseFreeFidelity).toBeCloseTo(1, 12);
    expect(powerDistance).toBeCloseTo(0, 12);
  });

  it('takes rows in any order, Windows line ends, semicolons, tabs, quotes and a byte order mark', async () => {
    const table = await withTable();
    const [header, ...rows] = (await table.read('t/phases.csv')).trimEnd().split('\n');
    const byPort = [...rows].sort((a, b) => Number(a.split(',')[4]) - Number(b.split(',')[4]));
    const variants = {
      'sorted.csv': [header, ...byPort].join('\n'),
      'windows.csv': [header, ...rows, ''].join('\r\n'),
      'excel.csv': `\ufeff${[header, ...byPort, ''].join('\r\n').replaceAll(',', ';')}`,
      'tabs.csv': [header, ...rows, '', ''].join('\n').replaceAll(',', '\t'),
      'quoted.csv': [header, ...rows].map((line) => `"${line!.replaceAll(',', '","')}"`).join('\n'),
      'old-mac.csv': [header, ...rows].join('\r'),
    };
    for (const [name, text] of Object.entries(variants)) {
      const run = await runCommand(
        ['verify', name, '--target', 'dft(3)', '--layout', 'rectangular', '--json', '--quiet'],
        {
          folder: table.folder,
          files: { [name]: text },
        },
      );
      expect([name, run.code, run.stderr]).toEqual([name, 0, '']);
      expect(meritOf(run.stdout)['fidelity']).toBeCloseTo(1, 12);
    }
  });

  it('needs --chip or --layout, and --target, for a lone CSV', async () => {
    const table = await withTable();
    const files = { 'lone/a.csv': await table.read('t/phases.csv'), 'c.chip.json': '{"modes": 3}' };
    const run = async (...options: string[]): Promise<CommandRun> =>
      runCommand(['verify', 'lone/a.csv', '--out', `r${options.length}`, ...options], { files });
    const [bare, chipOnly, both] = await Promise.all([
      run(),
      run('--chip', 'c.chip.json'),
      run('--chip', 'c.chip.json', '--target', 'dft(3)', '--require', 'fidelity=0.999999'),
    ]);
    expect([bare.code, chipOnly.code, both.code]).toEqual([2, 2, 0]);
    expect(bare.stderr).toContain('its chip is not known');
    expect(chipOnly.stderr).toContain('Name it with --target.');
  });

  it('takes --chip and --target before what the JSON says', async () => {
    const { folder } = await withTable();
    const files = { 'lossy.chip.json': '{"modes": 3, "name": "lossy", "lossDb": {"column": 1, "input": 2}}' };
    const run = await runCommand(
      [
        'verify',
        't/phases.json',
        '--chip',
        'lossy.chip.json',
        '--target',
        'dft(3)',
        '--transpose',
        '--conjugate',
        '--json',
        '--quiet',
      ],
      { folder, files },
    );
    expect(asRecord(run.stdout)).toMatchObject({ chip: { name: 'lossy' }, target: { source: 'dft(3)' } });
    const { transmissionDb, fidelity } = meritOf(run.stdout);
    // Three columns of 1 dB and a facet of 2 dB.
    expect(transmissionDb).toBeCloseTo(-5, 12);
    // The square of the Fourier transform is the parity, whose trace is 1 for three ports: F = 1/9.
    expect(fidelity).toBeCloseTo(1 / 9, 12);
  });

  it('finds a table of another layout out, also by --layout before the JSON', async () => {
    const folder = freshFolder();
    const four = await runCommand(['phases', 'dft(4)', '--out', 'f', '--quiet'], { folder });
    const other = await runCommand(['verify', 'f/phases.csv', '--layout', 'triangular'], { folder });
    expect([four.code, other.code]).toEqual([0, 2]);
    expect(other.stderr).toContain('made for another layout, mirror or cell style');
  });

  it('ends with 1 when a requirement is not met', async () => {
    const { folder } = await withTable();
    const files = { 'lossy.chip.json': '{"modes": 3, "lossDb": {"output": [0, 0, 3]}}' };
    const run = await runCommand(
      ['verify', 't/phases.csv', '--chip', 'lossy.chip.json', '--require', 'transmission=0.9'],
      { folder, files },
    );
    expect(run.code).toBe(1);
    // (1 + 1 + 10^-0.3)/3
    expect(run.stderr).toContain('required transmission=0.9 is not met: it is 0.833729');
    expect(run.listing).toContain('out/verify-t/report.json');
  });

  it('refuses options for reading a target that is not read', async () => {
    const { folder } = await withTable();
    for (const command of ['verify', 'figure']) {
      const run = await runCommand([command, 't/phases.csv', '--conjugate'], { folder });
      expect(run.code).toBe(2);
      expect(run.stderr).toContain('--conjugate says how a target is read');
    }
  });

  it('judges, as figure does, what the chip can set, and lists what it cannot', async () => {
    const { folder } = await withTable();
    const files = {
      'limited.chip.json': '{"modes": 3, "shifterOverrides": [{"shifter": 2, "rangeRad": [0, 1]}]}',
    };
    const options = ['t/phases.csv', '--chip', 'limited.chip.json', '--json'];
    const verified = await runCommand(['verify', ...options], { folder, files });
    const judged = asRecord(verified.stdout);
    const drawn = await runCommand(['figure', ...options], { folder, files });
    // The first internal phase of the three-port Fourier transform is pi/2.
    const list = [{ shifter: 2, wantedRad: expect.closeTo(Math.PI / 2, 12) as number, setRad: 1 }];
    expect(judged['outOfRange']).toEqual(list);
    expect(asRecord(drawn.stdout)['outOfRange']).toEqual(list);
    const fidelity = meritOf(verified.stdout)['fidelity'] as number;
    expect(fidelity).toBeLessThan(0.99);
    expect(await drawn.read('out/figure-t/mesh.svg')).toContain(
      `fidelity ${Number(fidelity.toPrecision(6))}`,
    );
  });

  it('stops phases at the limits of the chip and says so', async () => {
    const { folder } = await withTable();
    const files = {
      'limits.chip.json': '{"modes": 3, "shifterOverrides": [{"shifter": 2, "rangeRad": [0, 1]}]}',
    };
    const run = await runCommand(['verify', 't/phases.csv', '--chip', 'limits.chip.json', '--json'], {
      folder,
      files,
    });
    expect(asRecord(run.stdout)['outOfRange']).toMatchObject([{ shifter: 2, setRad: 1 }]);
    expect(run.stderr).toContain('shifter 2: wanted 1.570796 rad, set 1.000000 rad');
    expect(meritOf(run.stdout)['fidelity']).toBeLessThan(0.999);
  });
});

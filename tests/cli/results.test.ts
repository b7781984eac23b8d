import { describe, expect, it } from 'vitest';
import { asRecord, freshFolder, runCommand } from './runCommand.js';

describe.concurrent('results of a run', () => {
  it('are replaced by the same run', async () => {
    const { folder } = await runCommand(['target', 'dft(3)', '--out', 'r']);
    const again = await runCommand(['target', 'dft(3)', '--out', 'r'], { folder });
    expect([again.code, again.listing]).toEqual([0, ['r/', 'r/report.json']]);
  });

  it('are not replaced by another run without --force', async () => {
    const first = await runCommand(['phases', 'dft(3)', '--out', 'r']);
    const before = await first.read('r/phases.csv');
    const other = await runCommand(['phases', 'dft(4)', '--out', 'r'], { folder: first.folder });
    expect(other.code).toBe(2);
    expect(other.stdout).toBe('');
    expect(other.stderr.split('\n')).toEqual([
      'error: r: the results of another run are there (phases.csv, phases.json, mesh.svg, report.json)',
      'Choose another folder with --out, or replace them with --force.',
      '',
    ]);
    expect(await other.read('r/phases.csv')).toBe(before);
    expect(other.listing).toEqual(first.listing);
  });

  it('tell apart options that change the result, and no others', async () => {
    const { folder } = await runCommand(['phases', 'dft(3)', '--out', 'r']);
    const codes = [];
    for (const more of [['--unit', 'deg'], ['--json'], ['--conjugate'], ['--layout', 'triangular']]) {
      codes.push((await runCommand(['phases', 'dft(3)', '--out', 'r', ...more], { folder })).code);
    }
    expect(codes).toEqual([0, 0, 2, 2]);
  });

  it('give way to another run with --force, and nothing of the old one stays', async () => {
    const { folder } = await runCommand(['phases', 'dft(3)', '--out', 'r'], {
      files: { 'r/notes.txt': 'mine' },
    });
    // More than 64 ports are not drawn: the figure of the old run must go.
    const run = await runCommand(['phases', 'dft(65)', '--out', 'r', '--force'], { folder });
    expect(run.code).toBe(0);
    expect(run.listing).toEqual(['r/', 'r/notes.txt', 'r/phases.csv', 'r/phases.json', 'r/report.json']);
  });

  it('never lose what another command left: it may be what this one has read', async () => {
    const { folder } = await runCommand(['phases', 'dft(3)', '--out', 'r']);
    const run = await runCommand(['verify', 'r/phases.json', '--out', 'r', '--force'], { folder });
    expect(run.code).toBe(0);
    expect(run.listing).toEqual(['r/', 'r/mesh.svg', 'r/phases.csv', 'r/phases.json', 'r/report.json']);
    expect(asRecord(await run.read('r/report.json'))['command']).toBe('verify');
  });

  it('of a command that only reports may be replaced in their own folder', async () => {
    const { folder } = await runCommand(['target', 'dft(3)']);
    const again = await runCommand(['target', 'dft(3)', '--against', 'haar(3, 1)'], { folder });
    expect(again.code).toBe(0);
    expect(asRecord(await again.read('out/target-dft-3/report.json'))).toHaveProperty('merit');
    const named = await runCommand(['target', 'dft(3)', '--out', 'out/target-dft-3'], { folder });
    expect(named.code).toBe(2);
  });

  it('of tables in different folders do not meet', async () => {
    const { folder } = await runCommand(['phases', 'dft(3)']);
    await runCommand(['phases', 'dft(4)'], { folder });
    for (const modes of [3, 4]) {
      const run = await runCommand(['verify', `out/phases-dft-${modes}/phases.csv`], { folder });
      expect(run.code).toBe(0);
      expect(run.listing).toContain(`out/verify-phases-dft-${modes}/report.json`);
    }
  });

  it('leave files alone that a forged report names outside of the folder', async () => {
    const forged = JSON.stringify({
      runId: 'x',
      command: 'target',
      files: ['../mine.txt', '/etc/hostname', '.hidden', 'inner/a', 'old.csv'],
    });
    const run = await runCommand(['target', 'dft(2)', '--out', 'r', '--force'], {
      files: { 'r/report.json': forged, 'mine.txt': '', 'r/.hidden': '', 'r/inner/a': '', 'r/old.csv': '' },
    });
    expect(run.code).toBe(0);
    expect(run.listing).toEqual(['mine.txt', 'r/', 'r/.hidden', 'r/inner/', 'r/inner/a', 'r/report.json']);
  });

  it('go beside unrelated files, also into the current folder', async () => {
    const run = await runCommand(['phases', 'dft(2)', '--out', '.'], { files: { 'thesis.tex': 'x' } });
    expect(run.code).toBe(0);
    expect(run.listing).toEqual(['mesh.svg', 'phases.csv', 'phases.json', 'report.json', 'thesis.tex']);
    expect(await run.read('thesis.tex')).toBe('x');
  });

  it('do not replace a file of the same name that no run has written', async () => {
    const run = await runCommand(['phases', 'dft(2)', '--out', '.'], {
      files: { 'mesh.svg': 'drawn by hand' },
    });
    expect(run.code).toBe(2);
    expect(run.listing).toEqual(['mesh.svg']);
    expect(await run.read('mesh.svg')).toBe('drawn by hand');
  });

  it('are whole when two runs write into one folder at once', async () => {
    const folder = freshFolder();
    const runs = await Promise.all(
      ['haar(6, 1)', 'haar(6, 2)', 'haar(6, 1)'].map((formula) =>
        runCommand(['phases', formula, '--out', 'r', '--quiet'], { folder }),
      ),
    );
    for (const { code } of runs) expect([0, 2]).toContain(code);
    expect(runs.some(({ code }) => code === 0)).toBe(true);
    const after = await runCommand(['verify', 'r/phases.csv', '--out', 'v', '--json'], { folder });
    expect(after.listing.filter((name) => name.startsWith('r/'))).toEqual([
      ...['r/', 'r/mesh.svg', 'r/phases.csv', 'r/phases.json', 'r/report.json'],
    ]);
    // Phases and target are of one and the same run.
    const { merit } = asRecord(after.stdout) as { merit: { fidelity: number } };
    expect(merit.fidelity).toBeCloseTo(1, 12);
  });

  it('go to a folder that is named after command and input', async () => {
    const folder = freshFolder();
    const files = { 'größe A.csv': '1,0\n0,1\n', 'one.chip.json': '{"modes": 2}', 'deep/er/t.json': '[[1]]' };
    const run = await runCommand(['phases', 'größe A.csv', '--quiet'], { folder, files });
    expect(run.code).toBe(0);
    await runCommand(['chip', 'one.chip.json', '--quiet'], { folder });
    await runCommand(['target', `${folder}/deep/er/t.json`, '--quiet'], { folder });
    const last = await runCommand(['target', '1/sqrt(2) * [1, 1; 1, -1]', '--quiet'], { folder });
    const folders = last.listing.filter((name) => /^out\/[^/]+\/$/.test(name));
    expect(folders).toEqual([
      'out/chip-one/',
      'out/phases-grosse-a/',
      'out/target-1-sqrt-2-1-1-1-1/',
      'out/target-t/',
    ]);
  });

  it('with --to: the named file is written with the results or not at all', async () => {
    const { folder } = await runCommand(['target', 'dft(3)', '--out', 'r', '--quiet']);
    const refused = await runCommand(['target', 'dft(2)', '--out', 'r', '--to', 'new/m.csv'], { folder });
    expect(refused.code).toBe(2);
    expect(refused.listing).toEqual(['r/', 'r/report.json']);
    const blocked = await runCommand(['target', 'dft(2)', '--to', 'r/report.json/m.csv', '--out', 'new'], {
      folder,
    });
    expect(blocked.code).toBe(2);
    expect(blocked.listing).toEqual(['r/', 'r/report.json']);
  });

  it('with --to: the same run may be repeated, another content needs --force', async () => {
    const { folder } = await runCommand(['target', 'dft(2)', '--to', 'm.csv', '--out', 'r', '--quiet']);
    const again = await runCommand(['target', 'dft(2)', '--to', 'm.csv', '--out', 'r'], { folder });
    expect(again.code).toBe(0);
    const other = await runCommand(['target', 'dft(3)', '--to', 'm.csv', '--out', 's'], { folder });
    expect(other.code).toBe(2);
    expect(other.stderr).toContain('m.csv: there is such a file already');
    expect(other.listing).not.toContain('s/');
    const forced = await runCommand(['target', 'dft(3)', '--to', 'm.csv', '--out', 's', '--force'], {
      folder,
    });
    expect(forced.code).toBe(0);
    expect((await forced.read('m.csv')).trimEnd().split('\n').length).toBe(3);
  });

  it('with --to: one of the results may be named, the report may not', async () => {
    const { folder } = await runCommand(['phases', 'dft(2)', '--out', 'p', '--quiet']);
    const same = await runCommand(['figure', 'p/phases.csv', '--out', 'f', '--to', './f/mesh.svg'], {
      folder,
    });
    expect(same.code).toBe(0);
    expect(same.listing.filter((name) => name.startsWith('f/'))).toEqual([
      'f/',
      'f/mesh.svg',
      'f/report.json',
    ]);
    const report = await runCommand(['target', 'dft(2)', '--out', 't', '--to', 't/report.json'], { folder });
    expect(report.code).toBe(2);
    expect(report.stderr).toContain('the name of the report');
  });
});

import { readFile } from 'node:fs/promises';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { asRecord, COMMAND, freshFolder, meritOf, runCommand, runMany, runProgram } from './runCommand.js';

describe.concurrent('target', () => {
  it('writes all six kinds, which read back as the same matrix', async () => {
    const folder = freshFolder();
    const first = await runCommand(['target', 'haar(4, 2)', '--to', 'm.npy', '--json', '--quiet'], {
      folder,
    });
    const hash = asRecord(first.stdout)['runId'];
    const bytes = await readFile(join(folder, 'm.npy'));
    for (const kind of ['csv', 'tsv', 'txt', 'json', 'mtx']) {
      const there = await runCommand(
        ['target', 'm.npy', '--to', `m.${kind}`, '--out', kind, '--json', '--quiet'],
        {
          folder,
        },
      );
      expect([kind, there.code, there.stderr]).toEqual([kind, 0, '']);
      const back = await runCommand(
        ['target', `m.${kind}`, '--to', `from-${kind}.npy`, '--out', `${kind}-back`, '--json', '--quiet'],
        { folder },
      );
      // The identity of a run hangs on the bits of the matrix.
      expect([kind, asRecord(back.stdout)['runId']]).toEqual([kind, hash]);
      expect((await readFile(join(folder, `from-${kind}.npy`))).equals(bytes), kind).toBe(true);
    }
  });

  it('shows size, kind and entries', async () => {
    const run = await runCommand(['target', 'hadamard(2)']);
    expect(run.stdout.split('\n')).toEqual([
      'hadamard(2): 2 x 2, real',
      expect.stringMatching(/^unitarity defect \S+ \(max \|U\^dagger U - I\|\)$/),
      ' 0.70711+0.00000i   0.70711+0.00000i',
      ' 0.70711+0.00000i  -0.70711+0.00000i',
      '',
    ]);
    expect(run.stderr).toBe('written to out/target-hadamard-2: report.json\n');
  });

  it('judges a measured matrix with --against, unitary or not', async () => {
    const run = await runCommand(
      ['target', 'identity(2)', '--against', 'measured.csv', '--require', 'transmission=0.5', '--json'],
      { files: { 'measured.csv': '0.6, 0\n0, 0.8i\n' } },
    );
    expect(run.code).toBe(0);
    const { fidelity, transmission } = meritOf(run.stdout);
    // |0.6 + 0.8i|^2 / (2 * 1) and (0.36 + 0.64)/2.
    expect(fidelity).toBeCloseTo(0.5, 14);
    expect(transmission).toBeCloseTo(0.5, 14);
    expect(asRecord(run.stdout)['requirements']).toMatchObject([{ key: 'transmission', met: true }]);
  });

  it('reports the distance of the nearest unitary', async () => {
    const run = await runCommand(['target', '-', '--nearest', '--to', 'm.json'], {
      input: '3 0 0 0\n0 3 0 0\n0 0 3 0\n0 0 0 3\n',
    });
    expect(run.stdout).toContain('nearest unitary taken, at distance 4 (Frobenius)');
    const { matrix } = asRecord(await run.read('m.json')) as { matrix: number[][][] };
    expect(matrix[0]![0]![0]).toBeCloseTo(1, 14);
  });
});

describe.concurrent('chip', () => {
  it('makes a chip file, which it then checks and phases takes', async () => {
    const making = [
      ...[
        'chip',
        '--modes',
        '6',
        '--layout',
        'triangular',
        '--mirror',
        'ports',
        '--internal',
        'differential',
      ],
      ...[
        '--external',
        'lower-output',
        '--splitter-form',
        'real',
        '--splitters',
        '3',
        '--no-port-shifters',
        '--coupling-ratio',
        '0.48',
      ],
      ...['--name', 'Beacon 2', '--to', 'b.chip.json', '--json', '--quiet'],
    ];
    const made = await runCommand(making);
    expect([made.code, made.stderr]).toEqual([0, '']);
    expect(made.listing).toEqual([
      ...['b.chip.json', 'out/', 'out/chip-beacon-2/', 'out/chip-beacon-2/beacon-2.chip.json'],
      'out/chip-beacon-2/report.json',
    ]);
    expect(asRecord(await made.read('b.chip.json'))).toEqual({
      format: 1,
      name: 'Beacon 2',
      modes: 6,
      layout: 'triangular',
      mirror: 'ports',
      portShifters: false,
      cellStyle: { internal: 'differential', external: 'lower-output', splitterForm: 'real', splitters: 3 },
      couplingRatio: 0.48,
    });
    const { folder } = made;
    const checked = await runCommand(['chip', 'b.chip.json', '--json', '--out', 'c'], { folder });
    expect(asRecord(checked.stdout)).toMatchObject({
      command: 'chip',
      // 2N - 3 columns, N(N-1)/2 cells, N(N-1) shifters without those at the ports.
      chip: { name: 'Beacon 2', modes: 6, layout: 'triangular', columns: 9, cells: 15, shifters: 30 },
    });
    const programmed = await runCommand(['phases', 'identity(6)', '--chip', 'b.chip.json', '--quiet'], {
      folder,
    });
    expect(programmed.code).toBe(0);
  });

  it('says which states cells of three splitters miss', async () => {
    const cells = [
      // All in reach; the two around the arms cannot pass half of the light straight on (0.9 and 0.1).
      { cell: 1, couplingRatio: [0.45, 0.45, 0.45] },
      { cell: 2, couplingRatio: [0.5, 0.99, 0.99] },
    ];
    const chip = { modes: 3, cellStyle: { splitters: 3 }, measuredCells: cells };
    const run = await runCommand(['chip', 'c.chip.json'], { files: { 'c.chip.json': JSON.stringify(chip) } });
    expect(run.stdout).toContain('3 symmetric splitters');
    expect(run.stdout).toMatch(/1 cells? cannot reach the full cross state, 1 not the full bar state/);
  });

  it('says what a chip file describes', async () => {
    const run = await runCommand(['chip', 'c.chip.json'], {
      files: {
        'c.chip.json': JSON.stringify({
          name: 'C',
          modes: 3,
          measuredCells: [{ cell: 2, couplingRatio: [0.4, 0.5] }],
          lossDb: { splitter: 0.02, output: [1, 2, 1.5] },
        }),
      },
    });
    expect(run.stdout).toContain('C: rectangular mesh, 3 ports, 3 cells in 3 columns, 9 shifters');
    expect(run.stdout).toMatch(/1 cells? cannot reach the full cross state, 1 not the full bar state/);
    expect(run.stdout).toContain('splitter 0.02, shifter 0, column 0, input 0, output 1 to 2');
  });
});

describe.concurrent('figure', () => {
  it('writes mesh.svg and the file that --to names, the same bytes', async () => {
    const { folder } = await runCommand(['phases', 'dft(3)', '--out', 't', '--quiet']);
    const run = await runCommand(
      [
        'figure',
        't/phases.json',
        '--to',
        'paper/Fig 1.svg',
        '--width',
        'one-column',
        '--title',
        '<b>&',
        '--out',
        'f',
      ],
      { folder },
    );
    expect([run.code, run.stdout]).toEqual([0, '']);
    const svg = await run.read('f/mesh.svg');
    expect(await run.read('paper/Fig 1.svg')).toBe(svg);
    expect(svg).toContain('width="85mm"');
    expect(svg).toContain('&lt;b&gt;&amp;');
    expect(svg).not.toContain('<b>');
    expect(asRecord(await run.read('f/report.json'))).toMatchObject({
      command: 'figure',
      files: ['mesh.svg', 'report.json'],
    });
    const json = await runCommand(['figure', 't/phases.json', '--out', 'g', '--json'], { folder });
    expect(json.stdout).toBe(await json.read('g/report.json'));
  });
});

describe.concurrent('the command as a whole', () => {
  it('prints help with examples for every command, on stdout', async () => {
    const commands = ['phases', 'verify', 'target', 'chip', 'figure'];
    const helps = await runMany(commands.map((command) => ({ args: ['help', command], files: {} })));
    helps.forEach((help, k) => {
      expect([help.code, help.stderr]).toEqual([0, '']);
      expect(help.stdout).toMatch(new RegExp(`^Examples:\n  phasewright ${commands[k]} `, 'm'));
      for (const option of ['--out', '--json', '--quiet', '--force']) expect(help.stdout).toContain(option);
    });
    const flag = await runCommand(['verify', '--help']);
    expect([flag.code, flag.stdout]).toEqual([0, helps[1]!.stdout]);
  });

  it('prints help and version, and shows help on stderr when called bare', async () => {
    const [help, version, bare] = await Promise.all([
      runCommand(['--help']),
      runCommand(['--version']),
      runCommand([]),
    ]);
    expect([help.code, help.stderr]).toEqual([0, '']);
    expect(help.stdout).toMatch(/Exit codes: 0 done, 1/);
    expect(version.stdout).toMatch(/^\d+\.\d+\.\d+\n$/);
    expect([bare.code, bare.stdout]).toEqual([2, '']);
    expect(bare.stderr).toContain('Usage: phasewright');
  });

  it('colours errors on a terminal only, and not with NO_COLOR', async () => {
    const escape = '\u001b[';
    const terminal = { nodeArguments: ['--import', 'data:text/javascript,process.stderr.isTTY=true'] };
    const [piped, onServer, shown, plain] = await Promise.all([
      runCommand(['phases', 'nope.csv']),
      // What servers of continuous integration set makes no pipe a terminal.
      runCommand(['phases', 'nope.csv'], { environment: { CI: 'true', FORCE_COLOR: '1' } }),
      runCommand(['phases', 'nope.csv'], terminal),
      runCommand(['phases', 'nope.csv'], { ...terminal, environment: { NO_COLOR: '1' } }),
    ]);
    expect(piped.stderr).not.toContain(escape);
    expect(onServer.stderr).toBe(piped.stderr);
    expect(shown.stderr).toContain(escape);
    expect(plain.stderr).toBe(piped.stderr);
  });

  it('ends quietly when the reader closes the pipe, with the exit code that it would have', async () => {
    const folder = freshFolder();
    await runCommand(['phases', 'haar(12, 1)', '--out', 'r', '--quiet'], { folder });
    const command = `"${process.execPath}" "${COMMAND}"`;
    // `:` reads nothing, and is gone long before the command writes.
    const script = `{ ${command} $@; echo "code $?" >&2; } | :`;
    const run = async (...args: string[]): Promise<string> =>
      (await runProgram('sh', ['-c', script, 'sh', ...args], folder)).stderr;
    expect(await run('phases', 'haar(12,1)', '--out', 'p', '--quiet', '--json')).toBe('code 0\n');
    expect(
      await run('phases', 'haar(12,1)', '--out', 'q', '--json', '--quiet', '--require', 'rmsError=-1'),
    ).toBe('code 1\n');
    const head = await runProgram('sh', ['-c', `${command} help phases | head -1`], folder);
    expect(head).toEqual({ code: 0, stdout: 'Usage: phasewright phases [options] <target>\n', stderr: '' });
  });

  it('takes options before and after the argument, and absolute paths', async () => {
    const folder = freshFolder();
    const path = join(folder, 'sub', 'Ziel mit Lücke.csv');
    const run = await runCommand(
      ['phases', '--out', join(folder, 'r'), '--quiet', path, '--unit=deg', '--json'],
      {
        folder,
        files: { 'sub/Ziel mit Lücke.csv': '0;1\r\n1;0\r\n' },
      },
    );
    expect([run.code, run.stderr]).toEqual([0, '']);
    expect(asRecord(run.stdout)['target']).toMatchObject({ source: path });
  });

  it('takes a formula with a leading minus behind --', async () => {
    const run = await runCommand(['target', '--quiet', '--json', '--', '-dft(2)']);
    expect(run.code).toBe(0);
    expect(run.listing).toContain('out/target-dft-2/report.json');
  });

  it('keeps names with markup and control characters from the terminal and the figure', async () => {
    const name = 'x\u001b[31m\u0007<script>alert(1)</script>\nfidelity 1';
    const chip = {
      name,
      modes: 2,
      portNames: ['a\u001b[2J', '"><svg onload=1>'],
      shifterOverrides: [{ shifter: 1, name: '=1+1\r\n,"' }],
    };
    const files = { 'n.chip.json': JSON.stringify(chip) };
    const { folder, ...run } = await runCommand(['phases', 'dft(2)', '--chip', 'n.chip.json', '--out', 'r'], {
      files,
    });
    expect(run.code).toBe(0);
    // eslint would object to the control characters in a pattern written out.
    const control = new RegExp('[\\u0000-\\u0009\\u000b-\\u001f\\u007f-\\u009f]');
    for (const text of [run.stdout, run.stderr]) expect(text).not.toMatch(control);
    expect(run.stdout).not.toMatch(/^fidelity 1/m);
    const svg = await run.read('r/mesh.svg');
    expect(svg).not.toMatch(/<script|<svg onload|\u001b/);
    expect(svg).toContain('&lt;script&gt;');
    // The CSV quotes the name, and reads back.
    expect(await run.read('r/phases.csv')).toContain(',"=1+1\r\n,"""\n');
    const verified = await runCommand(['verify', 'r/phases.csv', '--require', 'fidelity=0.999'], { folder });
    expect(verified.code).toBe(0);
    const checked = await runCommand(['chip', 'n.chip.json'], { folder });
    expect(checked.stdout).not.toMatch(control);
  });
});

import { readFile } from 'node:fs/promises';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { asRecord, meritOf, npyFile, runCommand } from './runCommand.js';
import type { Pair } from './transferFromCsv.js';
import { fourierMatrix, largestDistance, transferFromCsv } from './transferFromCsv.js';

const HEADER = 'shifter,cell,role,column,port,phase_rad,name';
const MERIT_KEYS = [
  ...['fidelity', 'averageGateFidelity', 'portPhaseFreeFidelity', 'rmsError', 'worstCaseError'],
  ...['powerDistance', 'transmission', 'transmissionDb'],
];
/**
 * Ratios of which the bar state is out of reach: cos^2(a-b) = 4 * 0.45 * 0.55 = 0.99 (conventions, cell
 * solver).
 */
const SHORT_OF_BAR = JSON.stringify({
  name: 'short of bar',
  modes: 2,
  measuredCells: [{ cell: 1, couplingRatio: [0.45, 0.55] }],
});

describe.concurrent('phases', () => {
  it('writes the four files, with the header line and one row a shifter', async () => {
    const run = await runCommand(['phases', 'dft(4)']);
    expect(run.code).toBe(0);
    expect(run.listing).toEqual([
      'out/',
      ...['', 'mesh.svg', 'phases.csv', 'phases.json', 'report.json'].map(
        (name) => `out/phases-dft-4/${name}`,
      ),
    ]);
    const lines = (await run.read('out/phases-dft-4/phases.csv')).split('\n');
    expect(lines[0]).toBe(HEADER);
    expect(lines.length).toBe(1 + 16 + 1);
    expect(lines[17]).toBe('');
    expect(lines.slice(1, 17).map((line) => Number(line.split(',')[0]))).toEqual(
      Array.from({ length: 16 }, (_, k) => k + 1),
    );
    // Port shifters have neither cell nor column.
    expect(lines[13]).toMatch(/^13,,output,,1,[\d.]+,$/);
    expect(await run.read('out/phases-dft-4/mesh.svg')).toMatch(/^<svg /);
  });

  it('writes phases that make the Fourier transform in the textbook cell, to full double precision', async () => {
    for (const layout of ['rectangular', 'triangular']) {
      const run = await runCommand(['phases', 'dft(5)', '--layout', layout, '--out', 'r', '--quiet']);
      expect(run.code).toBe(0);
      const transfer = transferFromCsv(await run.read('r/phases.csv'), 5);
      // 10 cells, each a few roundings of 1.1e-16, and the sum of five products.
      expect(largestDistance(transfer, fourierMatrix(5))).toBeLessThan(5e-15);
    }
  });

  it('reports the fields of the contract, files last, lists present even when empty', async () => {
    const run = await runCommand(['phases', 'dft(3)', '--out', 'r']);
    const report = asRecord(await run.read('r/report.json'));
    expect(Object.keys(report)).toEqual([
      ...['version', 'runId', 'command', 'target', 'chip', 'merit', 'outOfReach', 'outOfRange'],
      ...['missingPortPhases', 'retunings', 'leastMargin', 'reach', 'stuckShifters'],
      ...['requirements', 'cautions', 'files'],
    ]);
    expect(report['command']).toBe('phases');
    expect(report['runId']).toMatch(/^[0-9a-f]{16}$/);
    expect(Object.keys(report['target'] as object)).toEqual([
      'source',
      'modes',
      'unitarityDefect',
      'nearestDistance',
    ]);
    expect(report['chip']).toEqual({
      name: 'ideal rectangular 3',
      modes: 3,
      layout: 'rectangular',
      cells: 3,
      columns: 3,
    });
    expect(Object.keys(report['merit'] as object)).toEqual(MERIT_KEYS);
    expect([report['outOfReach'], report['outOfRange'], report['missingPortPhases']]).toEqual([[], [], []]);
    expect(report['files']).toEqual(['phases.csv', 'phases.json', 'mesh.svg', 'report.json']);
    expect(meritOf(await run.read('r/report.json'))['fidelity']).toBeCloseTo(1, 12);
  });

  it('keeps target, chip, version, options and hashes in phases.json', async () => {
    const run = await runCommand(['phases', 'dft(2)', '--conjugate', '--out', 'r']);
    const table = asRecord(await run.read('r/phases.json'));
    expect(Object.keys(table)).toEqual([
      ...['format', 'version', 'target', 'chip', 'options', 'hashes', 'shifters'],
    ]);
    expect(table['format']).toBe(1);
    expect(table['chip']).toMatchObject({ modes: 2, layout: 'rectangular' });
    expect(table['options']).toEqual({ conjugate: true });
    expect(table['target']).toMatchObject({ source: 'dft(2)', modes: 2 });
    const csvRows = (await run.read('r/phases.csv')).trimEnd().split('\n').slice(1);
    const shifters = table['shifters'] as { shifter: number; role: string; phaseRad: number }[];
    expect(shifters.map(({ shifter, role, phaseRad }) => [shifter, role, phaseRad])).toEqual(
      csvRows.map((row) => row.split(',')).map((row) => [Number(row[0]), row[2], Number(row[5])]),
    );
  });

  it('prints the report byte for byte with --json, and nothing else on stdout', async () => {
    const run = await runCommand(['phases', 'dft(3)', '--json', '--out', 'r']);
    expect(run.stdout).toBe(await run.read('r/report.json'));
    expect(run.listing).toContain('r/mesh.svg');
    expect(run.stderr).toContain('written to r');
  });

  it('keeps result and messages on their own streams, and is silent with --quiet', async () => {
    const [loud, quiet, quietJson] = await Promise.all([
      runCommand(['phases', 'dft(3)']),
      runCommand(['phases', 'dft(3)', '--quiet']),
      runCommand(['phases', 'dft(3)', '--quiet', '--json']),
    ]);
    expect(loud.stdout).toContain('fidelity');
    expect(loud.stdout).not.toMatch(/written to|caution/);
    expect(loud.stderr).toMatch(
      /^written to out\/phases-dft-3: phases\.csv, phases\.json, mesh\.svg, report\.json$/m,
    );
    expect(loud.stderr).toContain('IEC 60825-1');
    expect([quiet.code, quiet.stdout, quiet.stderr]).toEqual([0, '', '']);
    expect(quiet.listing).toContain('out/phases-dft-3/phases.csv');
    expect([quietJson.stderr, asRecord(quietJson.stdout)['command']]).toEqual(['', 'phases']);
  });

  it('prints phases in the unit asked for, and writes radians all the same', async () => {
    // sin^2(theta/2) = |W11|^2 = 1/2 for a symmetric splitter at 1/2: theta is a quarter turn.
    const expected = { rad: '1.570796', pi: '0.500000', deg: '90.0000' };
    for (const [unit, quarter] of Object.entries(expected)) {
      const run = await runCommand(['phases', 'splitter(0.5)', '--unit', unit, '--out', 'r']);
      expect(run.stdout).toMatch(new RegExp(`2 +1 +internal +1 +1 +${quarter.replace('.', '\\.')}$`, 'm'));
      expect(run.stdout).toContain(`phase (${unit})`);
      const internal = (await run.read('r/phases.csv')).split('\n')[2]!.split(',');
      expect(Number(internal[5])).toBeCloseTo(Math.PI / 2, 14);
    }
  });

  it('gives the same bytes for the same input', async () => {
    const run = await runCommand(['phases', 'haar(5, 3)', '--out', 'a', '--quiet']);
    await runCommand(['phases', 'haar(5, 3)', '--out', 'b', '--quiet'], { folder: run.folder });
    for (const name of ['phases.csv', 'phases.json', 'mesh.svg', 'report.json']) {
      const [a, b] = await Promise.all(['a', 'b'].map((from) => readFile(join(run.folder, from, name))));
      expect(a!.equals(b!), name).toBe(true);
    }
  });

  it('ends with 1 when a requirement is not met, and writes the files all the same', async () => {
    const files = { 'short.chip.json': SHORT_OF_BAR };
    const command = ['phases', 'identity(2)', '--chip', 'short.chip.json', '--out', 'r'];
    const [met, missed, free] = await Promise.all([
      runCommand([...command, '--require', 'fidelity=0.9899'], { files }),
      runCommand([...command, '--require', 'fidelity=0.9899', '--require', 'fidelity=0.9901'], { files }),
      runCommand(command, { files }),
    ]);
    expect([met.code, missed.code, free.code]).toEqual([0, 1, 0]);
    expect(missed.listing).toContain('r/report.json');
    expect(missed.stderr).toContain('required fidelity=0.9901 is not met');
    expect(missed.stderr).not.toContain('0.9899');
    // F = |Tr V|^2 / N^2 with both diagonal entries of modulus cos(a-b): exactly 0.99.
    expect(meritOf(await missed.read('r/report.json'))['fidelity']).toBeCloseTo(0.99, 12);
    const judged = asRecord(await missed.read('r/report.json'))['requirements'];
    expect(judged).toMatchObject([
      { key: 'fidelity', met: true },
      { key: 'fidelity', met: false },
    ]);
  });

  it('takes requirements on errors as upper limits', async () => {
    // rms error sqrt(2 (1 - sqrt(F))) = 0.10012, and the power distance is the 0.01 that crosses.
    const kept = ['rmsError=0.1002', 'worstCaseError=0.1002', 'powerDistance=0.0101'];
    const missed = ['rmsError=0.1', 'worstCaseError=0.1', 'powerDistance=0.0099'];
    const run = async (limits: readonly string[]): Promise<unknown[]> => {
      const { code, stdout } = await runCommand(
        [
          ...['phases', 'identity(2)', '--chip', 'short.chip.json', '--json', '--quiet'],
          ...limits.flatMap((limit) => ['--require', limit]),
        ],
        { files: { 'short.chip.json': SHORT_OF_BAR } },
      );
      const { requirements } = asRecord(stdout) as { requirements: { met: boolean }[] };
      return [code, ...requirements.map(({ met }) => met)];
    };
    expect(await run(kept)).toEqual([0, true, true, true]);
    expect(await run([...kept, ...missed])).toEqual([1, true, true, true, false, false, false]);
  });

  it('lists bar powers out of reach, and what the uncorrected phases would do', async () => {
    const files = { 'short.chip.json': SHORT_OF_BAR };
    const run = await runCommand(['phases', 'identity(2)', '--chip', 'short.chip.json', '--out', 'r'], {
      files,
    });
    const report = asRecord(await run.read('r/report.json'));
    const [entry] = report['outOfReach'] as {
      cell: number;
      column: number;
      port: number;
      wanted: number;
      reach: number[];
    }[];
    expect(entry).toMatchObject({ cell: 1, column: 1, port: 1, wanted: 1 });
    expect(entry!.reach[0]).toBeCloseTo(0, 14);
    expect(entry!.reach[1]).toBeCloseTo(0.99, 14);
    expect(Object.keys(report['meritUncorrected'] as object)).toEqual(MERIT_KEYS);
    expect(run.stderr).toContain('1 cell cannot reach its bar power');
    expect(run.stdout).toContain('phases of an ideal chip');
  });

  it('lists shifters out of range, with what they are set to', async () => {
    const chip = JSON.stringify({
      modes: 2,
      shifterOverrides: [{ shifter: 2, name: 'H2', rangeRad: [0, 1] }],
    });
    const run = await runCommand(['phases', 'splitter(0.5)', '--chip', 'c.chip.json', '--out', 'r'], {
      files: { 'c.chip.json': chip },
    });
    const { outOfRange } = asRecord(await run.read('r/report.json')) as {
      outOfRange: { shifter: number; wantedRad: number; setRad: number }[];
    };
    expect(outOfRange).toMatchObject([{ shifter: 2, setRad: 1 }]);
    expect(outOfRange[0]!.wantedRad).toBeCloseTo(Math.PI / 2, 12);
    // Two cells whose internal phases differ by delta overlap with cos(delta / 2) at the best port phases.
    expect(meritOf(await run.read('r/report.json'))['fidelity']).toBeCloseTo(
      Math.cos((Math.PI / 2 - 1) / 2) ** 2,
      12,
    );
    expect(run.stderr).toContain('1 shifter is out of range');
    expect(run.stderr).toContain('Limits are given for some shifters only');
    expect((await run.read('r/phases.csv')).split('\n')[2]).toBe('2,1,internal,1,1,1,H2');
  });

  it('reports the phases that a chip without port shifters lacks', async () => {
    const run = await runCommand(['phases', 'dft(3)', '--chip', 'bare.chip.json', '--out', 'r'], {
      files: { 'bare.chip.json': '{"modes": 3, "portShifters": false}' },
    });
    const csv = await run.read('r/phases.csv');
    expect(csv.trimEnd().split('\n').length).toBe(1 + 6);
    expect(csv).not.toContain('output');
    const { missingPortPhases } = asRecord(await run.read('r/report.json')) as {
      missingPortPhases: { port: number; phaseRad: number }[];
    };
    expect(missingPortPhases.map(({ port }) => port)).toEqual([1, 2, 3]);
    // With these phases behind it, the bare mesh does the Fourier transform, up to a global phase.
    const output = missingPortPhases
      .map(({ port, phaseRad }) => `0,,output,,${port},${phaseRad},\n`)
      .join('');
    const transfer = transferFromCsv(csv + output, 3);
    const [re, im] = transfer[0]![0]!;
    const turnBack: Pair = [re / Math.hypot(re, im), -im / Math.hypot(re, im)];
    const turned = transfer.map((row) =>
      row.map(([x, y]): Pair => [x * turnBack[0] - y * turnBack[1], x * turnBack[1] + y * turnBack[0]]),
    );
    expect(largestDistance(turned, fourierMatrix(3))).toBeLessThan(1e-14);
    const merit = meritOf(await run.read('r/report.json'));
    expect(merit['portPhaseFreeFidelity']).toBeCloseTo(1, 12);
    expect(merit['fidelity']).toBeLessThan(0.99);
    expect(run.stdout).toContain('no port shifters');
  });

  it('takes a batch of matrices from one .npy file', async () => {
    const [one, zero]: [Pair, Pair] = [
      [1, 0],
      [0, 0],
    ];
    const half = Math.SQRT1_2;
    const batch = npyFile(
      [3, 2, 2],
      [
        ...[one, zero, zero, one],
        ...([
          [half, 0],
          [half, 0],
          [half, 0],
          [-half, 0],
        ] satisfies Pair[]),
        ...[zero, one, one, zero],
      ],
    );
    const files = { 'batch.npy': batch, 'short.chip.json': SHORT_OF_BAR };
    const run = await runCommand(
      ['phases', 'batch.npy', '--chip', 'short.chip.json', '--out', 'r', '--require', 'fidelity=0.995'],
      { files },
    );
    expect(run.code).toBe(1);
    expect(run.listing.filter((name) => name.startsWith('r/'))).toEqual([
      ...['r/', 'r/merit.csv'],
      ...[1, 2, 3].flatMap((k) => [`r/phases-00${k}.csv`, `r/phases-00${k}.json`]),
      'r/report.json',
    ]);
    const merit = (await run.read('r/merit.csv'))
      .trimEnd()
      .split('\n')
      .map((line) => line.split(','));
    expect(merit[0]).toEqual(['matrix', 'table', ...MERIT_KEYS]);
    expect(merit.slice(1).map((row) => row[1])).toEqual([
      'phases-001.csv',
      'phases-002.csv',
      'phases-003.csv',
    ]);
    // The identity alone needs the bar state that this chip lacks.
    expect(Number(merit[1]![2])).toBeCloseTo(0.99, 12);
    expect(Number(merit[2]![2])).toBeCloseTo(1, 12);
    expect(run.stderr).toContain('by matrix 1');
    expect(asRecord(await run.read('r/report.json'))['worst']).toBe(1);
  });

  it('takes a batch of one for a batch, and names the matrix that is not unitary', async () => {
    const [one, zero, two]: [Pair, Pair, Pair] = [
      [1, 0],
      [0, 0],
      [2, 0],
    ];
    const files = {
      'one.npy': npyFile([1, 2, 2], [one, zero, zero, one]),
      'bad.npy': npyFile([2, 2, 2], [one, zero, zero, one, one, zero, zero, two]),
    };
    const single = await runCommand(['phases', 'one.npy', '--out', 'r'], { files });
    expect(single.code).toBe(0);
    expect(single.listing).toEqual(expect.arrayContaining(['r/merit.csv', 'r/phases-001.csv']));
    const bad = await runCommand(['phases', 'bad.npy', '--out', 'r'], { files });
    expect(bad.code).toBe(2);
    expect(bad.stderr).toContain('bad.npy, matrix 2: the target is not unitary');
  });

  it('says how far the nearest unitary is', async () => {
    const run = await runCommand(['phases', '[1, 0; 0, 1.001]', '--nearest', '--out', 'r']);
    // Fan and Hoffman 1955: the distance of singular values 1 and 1.001 from 1.
    expect(run.stdout).toContain('nearest unitary taken, at distance 0.001 (Frobenius)');
  });

  it('reads standard input as CSV, as JSON and as .npy', async () => {
    const inputs = {
      csv: '0, 1\n1, 0\n',
      json: '  {"matrix": [[0, 1], ["1", [0, 0]]]}',
      npy: npyFile(
        [2, 2],
        [
          [0, 0],
          [1, 0],
          [1, 0],
          [0, 0],
        ],
      ),
    };
    for (const input of Object.values(inputs)) {
      const run = await runCommand(['target', '-', '--to', 'm.csv', '--json', '--quiet'], { input });
      expect(run.code).toBe(0);
      expect(asRecord(run.stdout)['target']).toMatchObject({ source: 'standard input', modes: 2 });
      expect(await run.read('m.csv')).toBe('0+0j,1+0j\n1+0j,0+0j\n');
    }
    const run = await runCommand(['phases', '-', '--out', 'r', '--quiet'], { input: inputs.csv });
    // The cross state: theta = 0.
    expect((await run.read('r/phases.csv')).split('\n')[2]).toBe('2,1,internal,1,1,0,');
  });

  it('puts a smaller target on the ports named, the identity elsewhere', async () => {
    const run = await runCommand(
      ['phases', 'permutation([2, 1])', '--ports', '3-4', '--chip', 'c.chip.json', '--out', 'r', '--quiet'],
      { files: { 'c.chip.json': '{"modes": 4}' } },
    );
    expect(run.code).toBe(0);
    const wanted = [
      [1, 0, 0, 0],
      [0, 1, 0, 0],
      [0, 0, 0, 1],
      [0, 0, 1, 0],
    ].map((row) => row.map((entry): Pair => [entry, 0]));
    expect(largestDistance(transferFromCsv(await run.read('r/phases.csv'), 4), wanted)).toBeLessThan(3e-15);
  });

  it('transposes and conjugates on demand', async () => {
    const turnedTo = async (...options: string[]): Promise<unknown> => {
      const run = await runCommand(['target', '-', ...options, '--to', 'm.json', '--quiet'], {
        input: '0 1\ni 0\n',
      });
      return asRecord(await run.read('m.json'))['matrix'];
    };
    const [o, one, i, minusI] = ['[0,0]', '[1,0]', '[0,1]', '[0,-1]'];
    const matrix = (text: string): unknown => JSON.parse(text);
    expect(await turnedTo()).toEqual(matrix(`[[${o},${one}],[${i},${o}]]`));
    expect(await turnedTo('--transpose')).toEqual(matrix(`[[${o},${i}],[${one},${o}]]`));
    const unsigned = JSON.stringify([
      await turnedTo('--conjugate'),
      await turnedTo('--conjugate', '--transpose'),
    ]);
    // A zero that is conjugated is -0, which JSON writes as 0 here.
    expect(matrix(unsigned)).toEqual(
      matrix(`[[[${o},${one}],[${minusI},${o}]],[[${o},${minusI}],[${one},${o}]]]`),
    );
  });

  it('takes the nearest unitary with --nearest and reports its distance', async () => {
    // The nearest unitary to 2 I is I, at Frobenius distance sqrt(2).
    const run = await runCommand(['phases', '-', '--nearest', '--json', '--quiet'], { input: '2,0\n0,2' });
    const { target } = asRecord(run.stdout) as {
      target: { unitarityDefect: number; nearestDistance: number };
    };
    expect(target.nearestDistance).toBeCloseTo(Math.SQRT2, 14);
    expect(target.unitarityDefect).toBeCloseTo(3, 14);
  });

  it('draws no figure of more than 64 ports, and drops the long table from the screen', async () => {
    const run = await runCommand(['phases', 'identity(65)', '--out', 'r']);
    expect(run.listing).not.toContain('r/mesh.svg');
    expect(asRecord(await run.read('r/report.json'))['files']).toEqual([
      'phases.csv',
      'phases.json',
      'report.json',
    ]);
    expect(run.stdout).toContain('4225 phases: see phases.csv');
  });

  it('programs one port, where there is nothing but an output phase', async () => {
    const run = await runCommand(['phases', '-', '--out', 'r', '--quiet'], { input: 'i\n' });
    expect([run.code, run.stderr]).toEqual([0, '']);
    expect(await run.read('r/phases.csv')).toBe(`${HEADER}\n1,,output,,1,${Math.PI / 2},\n`);
  });
});

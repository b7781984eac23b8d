import { spawnSync } from 'node:child_process';
import { existsSync, mkdirSync, mkdtempSync, readFileSync, renameSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';

const ROOT = fileURLToPath(new URL('../../', import.meta.url));
const folder = mkdtempSync(join(tmpdir(), 'phasewright-package-'));
const place = join(folder, 'user');
let packed: readonly string[] = [];

/** Runs a program to its end and returns what it printed; throws when it fails. */
function run(program: string, args: readonly string[], cwd: string): string {
  const { status, stdout, stderr } = spawnSync(program, args, { cwd, encoding: 'utf8' });
  if (status !== 0) throw new Error(`${program} ${args.join(' ')} ended with ${status}: ${stderr}${stdout}`);
  return stdout;
}

beforeAll(() => {
  const listed = run('npm', ['pack', '--json', '--ignore-scripts', '--pack-destination', folder], ROOT);
  const [{ filename, files }] = JSON.parse(listed) as [{ filename: string; files: { path: string }[] }];
  packed = files.map(({ path }) => path);
  mkdirSync(place);
  writeFileSync(join(place, 'package.json'), '{"private": true, "type": "module"}');
  const quietly = ['--prefer-offline', '--no-audit', '--no-fund', '--loglevel=error'];
  run('npm', ['install', ...quietly, join(folder, filename)], place);
});
afterAll(() => rmSync(folder, { recursive: true, force: true }));

describe('the package', () => {
  it('holds what is built and the example meshes, no sources and no tests', () => {
    expect(packed).toEqual(
      expect.arrayContaining(['package.json', 'dist/cli/main.js', 'dist/index.js', 'dist/index.d.ts']),
    );
    const strange = packed.filter(
      (path) => !/^(?:dist|meshes)\/|^(?:package\.json|README\.md|LICENSE)$/.test(path),
    );
    expect(strange).toEqual([]);
    const sources = packed.filter(
      (path) => (path.endsWith('.ts') && !path.endsWith('.d.ts')) || /test|\.map$/.test(path),
    );
    expect(sources).toEqual([]);
  });

  it('holds types for every module', () => {
    const modules = packed.filter((path) => path.startsWith('dist/') && path.endsWith('.js'));
    expect(modules.filter((path) => !packed.includes(path.replace(/\.js$/, '.d.ts')))).toEqual([]);
  });

  it('keeps what its manifest promises', () => {
    const manifest = JSON.parse(readFileSync(join(ROOT, 'package.json'), 'utf8')) as Manifest;
    const promised = [
      manifest.types,
      ...Object.values(manifest.bin),
      ...Object.values(manifest.exports).flatMap(targets),
    ];
    expect(promised.length).toBeGreaterThan(3);
    for (const path of promised)
      expect(existsSync(join(place, 'node_modules/phasewright', path)), path).toBe(true);
  });

  it('runs as a command where it is installed', () => {
    const command = join(place, 'node_modules/.bin/phasewright');
    expect(run(command, ['--version'], place)).toMatch(/^\d+\.\d+\.\d+\n$/);
    const report = JSON.parse(run(command, ['phases', 'dft(3)', '--json', '--quiet'], place)) as {
      merit: { fidelity: number };
    };
    expect(report.merit.fidelity).toBeCloseTo(1, 12);
    expect(existsSync(join(place, 'out/phases-dft-3/mesh.svg'))).toBe(true);
    // A formula that needs the formula library, which is loaded late.
    expect(run(command, ['target', 'kron(dft(2), identity(2))'], place)).toContain('4 x 4');
  });

  it('starts without the formula library for help, calls with numbers and matrix files', () => {
    const command = join(place, 'node_modules/.bin/phasewright');
    const [library, away] = [join(place, 'node_modules/mathjs'), join(place, 'mathjs-away')];
    renameSync(library, away);
    try {
      expect(run(command, ['--help'], place)).toContain('phases');
      expect(run(command, ['target', 'direct(dft(2), haar(2, 1))'], place)).toContain('4 x 4');
      const target = join(place, 'node_modules/phasewright/meshes/beacon-6.csv');
      expect(run(command, ['target', target, '--to', 'beacon.npy'], place)).toContain('6 x 6');
      expect(run(command, ['phases', 'beacon.npy', '--out', 'npy'], place)).toContain('fidelity');
      expect(() => run(command, ['target', 'dft(2) * dft(2)'], place)).toThrow();
    } finally {
      renameSync(away, library);
    }
  });

  it('is imported as a library, by its contents page alone', () => {
    const script = `
      import { evaluateExpression, idealChip, programChip, simulate, figuresOfMerit } from 'phasewright';
      const target = await evaluateExpression('haar(5, 1)');
      const chip = idealChip(5);
      const { program } = programChip(chip, target);
      console.log(figuresOfMerit(target, simulate(chip, program.settings)).fidelity);
      try { await import('phasewright/dist/chip/readChip.js'); console.log('open'); }
      catch (error) { console.log(error.code); }`;
    writeFileSync(join(place, 'use.mjs'), script);
    const [fidelity, inner] = run(process.execPath, ['use.mjs'], place).trim().split('\n');
    expect(Number(fidelity)).toBeCloseTo(1, 12);
    expect(inner).toBe('ERR_PACKAGE_PATH_NOT_EXPORTED');
  });

  it('tells a strict compiler its types', () => {
    const source = `
      import { figuresOfMerit, haarUnitary, idealChip, programChip, simulate, type Merit } from 'phasewright';
      const { program } = programChip(idealChip(4), haarUnitary(4, 1));
      export const merit: Merit = figuresOfMerit(haarUnitary(4, 1), simulate(idealChip(4), program.settings));
      // @ts-expect-error ports are a number: without types there would be no error to expect
      idealChip('4');`;
    writeFileSync(join(place, 'use.ts'), source);
    const compiler = join(ROOT, 'node_modules/typescript/bin/tsc');
    const options = ['--noEmit', '--strict', '--skipLibCheck', '--target', 'es2022', '--module', 'nodenext'];
    expect(run(process.execPath, [compiler, ...options, 'use.ts'], place)).toBe('');
  });
});

interface Manifest {
  readonly types: string;
  readonly bin: Readonly<Record<string, string>>;
  readonly exports: Readonly<Record<string, string | Readonly<Record<string, string>>>>;
}

function targets(entry: string | Readonly<Record<string, string>>): string[] {
  return typeof entry === 'string' ? [entry] : Object.values(entry);
}

import { spawnSync } from 'node:child_process';
import {
  chmodSync,
  cpSync,
  existsSync,
  mkdirSync,
  mkdtempSync,
  readFileSync,
  rmSync,
  statSync,
  symlinkSync,
  writeFileSync,
} from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { readChip } from '../../src/chip/readChip.js';

const ROOT = fileURLToPath(new URL('../../', import.meta.url));
const README = readFileSync(join(ROOT, 'README.md'), 'utf8');
const PACKAGE = JSON.parse(readFileSync(join(ROOT, 'package.json'), 'utf8')) as {
  scripts: Record<string, string>;
};

/** The texts of the README's code blocks of one language. */
function blocks(language: string): string[] {
  return Array.from(
    README.matchAll(new RegExp(`^\`\`\`${language}\\n([^]*?)^\`\`\``, 'gm')),
    (found) => found[1]!,
  );
}

const lines = blocks('sh').flatMap((block) => block.trimEnd().split('\n'));
const folder = mkdtempSync(join(tmpdir(), 'phasewright-readme-'));

function run(line: string): { status: number | null; stdout: string; stderr: string } {
  const path = `${join(folder, 'bin')}:${process.env['PATH'] ?? ''}`;
  return spawnSync('sh', ['-c', line], {
    cwd: folder,
    encoding: 'utf8',
    env: { ...process.env, PATH: path },
  });
}

beforeAll(() => {
  cpSync(join(ROOT, 'meshes'), join(folder, 'meshes'), { recursive: true });
  mkdirSync(join(folder, 'bin'));
  const command = join(folder, 'bin', 'phasewright');
  writeFileSync(command, `#!/bin/sh\nexec "${process.execPath}" "${join(ROOT, 'dist/cli/main.js')}" "$@"\n`);
  chmodSync(command, 0o755);
  mkdirSync(join(folder, 'node_modules'));
  symlinkSync(ROOT, join(folder, 'node_modules', 'phasewright'));
});

afterAll(() => rmSync(folder, { recursive: true, force: true }));

describe('every command of the README', () => {
  const commands = lines.filter((line) => line.includes('phasewright '));

  it('is one of the program or of npm', () => {
    expect(commands.length).toBeGreaterThan(10);
    expect(lines.filter((line) => !commands.includes(line))).toEqual([
      'npm install && npm start',
      'npm install && npm test',
    ]);
    expect(Object.keys(PACKAGE.scripts)).toEqual(expect.arrayContaining(['prepare', 'start', 'test']));
  });

  // One after another: some use what an earlier one wrote.
  it.each(commands)('%s', (line) => {
    const { status, stderr } = run(line);
    expect(status, stderr).toBe(0);
  });
});

it('the built command can be run as it is, as npm link has it', () => {
  expect(statSync(join(ROOT, 'dist/cli/main.js')).mode & 0o111).toBe(0o111);
});

it('npm start leaves table, report and figure, again and again; the figure is the one in the README', () => {
  for (let round = 0; round < 2; round++) {
    const { status, stderr } = run(PACKAGE.scripts['start']!.replace('node dist/cli/main.js', 'phasewright'));
    expect(status, stderr).toBe(0);
  }
  const results = join(folder, 'out', 'unscrambler');
  for (const name of ['phases.csv', 'phases.json', 'mesh.svg', 'report.json']) {
    expect(existsSync(join(results, name)), name).toBe(true);
  }
  const drawn = readFileSync(join(results, 'mesh.svg'), 'utf8');
  expect(drawn).toBe(readFileSync(join(ROOT, 'meshes', 'unscrambler.svg'), 'utf8'));
  expect(README).toContain('](meshes/unscrambler.svg)');
});

it('the library example runs', () => {
  const [example] = blocks('ts');
  writeFileSync(join(folder, 'example.mjs'), example!);
  const { status, stdout, stderr } = run('node example.mjs');
  expect(status, stderr).toBe(0);
  expect(Number(stdout)).toBeCloseTo(1, 12);
  expect(existsSync(join(folder, 'mesh.svg'))).toBe(true);
});

it('the chip file shown is a chip file', () => {
  const [example] = blocks('json');
  expect(readChip(new TextEncoder().encode(example)).chip.mesh.modes).toBe(8);
});

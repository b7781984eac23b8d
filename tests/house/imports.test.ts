import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { importedModules, importFaults } from './importDirections.js';
import { SOURCES, sourceFiles } from './sourceFiles.js';

describe('imports of src/', () => {
  it('point downward only, never sideways, and reach Node from cli and files alone', () => {
    const paths = sourceFiles();
    // The check has something to check.
    expect(paths.length).toBeGreaterThan(80);
    expect(paths).toContain('cli/main.ts');
    expect(paths.flatMap((path) => importFaults(path, readFileSync(join(SOURCES, path), 'utf8')))).toEqual(
      [],
    );
  });
});

describe('the check of imports', () => {
  it('sees every way to name a module', () => {
    const source = `
      import a from 'a'; import { b } from "b"; import * as c from 'c'; import 'd';
      import type { e } from 'e'; import { type f } from 'f';
      export { g } from 'g'; export * from 'h'; export type { i } from 'i';
      const j = await import('j'); type K = import('k').K; type L = typeof import('l');
      import m = require('m'); const n = require('n'); const o = await import(\`o\`);
      // import p from 'p';
      const q = "import q from 'q'";
      const r = await import(name);`;
    expect(importedModules('x.ts', source)).toEqual([...'abcdefghijklmno', '(name)']);
  });

  it('lets through what points downward', () => {
    const allowed: readonly (readonly [path: string, module: string])[] = [
      ['cli/phases.ts', '../files/readInput.js'],
      ['cli/phases.ts', '../errors/InputError.js'],
      ['cli/phases.ts', 'node:fs'],
      ['files/pool.ts', 'node:worker_threads'],
      ['photon/clicks.ts', '../program/programChip.js'],
      ['merit/merit.ts', './portPhaseFree.js'],
      ['chip/readChip.ts', 'zod'],
      ['matrix/haar.ts', '../random/RandomStream.js'],
      ['kernel/assembly/deep.ts', './normals'],
    ];
    for (const [path, module] of allowed) {
      expect(importFaults(path, `import type { x } from '${module}';`), `${path} ${module}`).toEqual([]);
    }
  });

  it('finds planted violations', () => {
    const planted: readonly (readonly [path: string, source: string, fault: string])[] = [
      ['matrix/a.ts', "import { x } from '../mesh/Mesh.js';", 'upward'],
      ['chip/a.ts', "import type { x } from '../target/limits.js';", 'same row'],
      ['simulate/a.ts', "export { x } from '../merit/merit.js';", 'same row'],
      ['drive/a.ts', "const x = await import('../photon/clicks.js');", 'same row'],
      ['errors/a.ts', "type X = import('../units/angle.js').X;", 'same row'],
      ['kernel/deep/a.ts', "import '../../cli/main.js';", 'upward'],
      ['figure/a.ts', "import { readFileSync } from 'node:fs';", 'module of Node'],
      ['figure/a.ts', "import { readFileSync } from 'fs';", 'module of Node'],
      ['target/a.ts', "import('node:vm').then(() => 1);", 'module of Node'],
      ['figure/a.ts', "import { x } from './b';", 'does not end in .js'],
      ['cli/a.ts', "import { x } from '../../tests/x.js';", 'outside'],
      ['cli/a.ts', "import { x } from '../index.js';", 'outside'],
      ['cli/a.ts', 'const x = await import(name);', 'no fixed name'],
      ['helpers/a.ts', '', 'no folder of the design'],
      ['stray.ts', '', 'no folder of the design'],
      ['index.ts', "export * from './mesh/Mesh.js';", 'no named re-export'],
      ['index.ts', "import { x } from './mesh/Mesh.js';", 'no named re-export'],
      ['index.ts', 'export const x = 1;', 'no named re-export'],
    ];
    for (const [path, source, fault] of planted) {
      const found = importFaults(path, source);
      expect(found.length, `${path}: ${source}`).toBe(1);
      expect(found[0]).toContain(fault);
    }
    expect(importFaults('index.ts', "export { a, type B } from './mesh/Mesh.js';")).toEqual([]);
  });
});

import { join } from 'node:path';
import ts from 'typescript';
import { describe, expect, it } from 'vitest';
import { SOURCES } from './sourceFiles.js';
import { programInMemory, undocumentedExports } from './undocumentedExports.js';

describe('the contents page', () => {
  it('exports nothing without a doc comment', () => {
    const path = join(SOURCES, 'index.ts');
    const options: ts.CompilerOptions = {
      target: ts.ScriptTarget.ES2022,
      module: ts.ModuleKind.NodeNext,
      moduleResolution: ts.ModuleResolutionKind.NodeNext,
      strict: true,
      skipLibCheck: true,
      types: [],
    };
    const program = ts.createProgram([path], options);
    const file = program.getSourceFile(path)!;
    const checker = program.getTypeChecker();
    const names = checker.getExportsOfModule(checker.getSymbolAtLocation(file)!).map(({ name }) => name);
    // The check has something to check.
    expect(names.length).toBeGreaterThan(20);
    expect(undocumentedExports(program, path)).toEqual([]);
  });
});

describe('the check of doc comments', () => {
  it('finds undocumented exports behind re-exports, of every kind', () => {
    const program = programInMemory({
      '/index.ts': "export { a, b, type C, type D, E, F, G, renamed as h } from './parts.js';",
      '/parts.ts': `
        /** Says what it is. */
        export function a(): void {}
        export function b(): void {}
        /** Says what it is. */
        export interface C {}
        export interface D {}
        /** Says what it is. */
        export class E {}
        // No doc comment.
        export const F = 1;
        /** */
        export const G = 2;
        /* Not one either. */
        export const renamed = 3;`,
    });
    expect(undocumentedExports(program, '/index.ts')).toEqual(['b', 'D', 'F', 'G', 'h']);
  });
});

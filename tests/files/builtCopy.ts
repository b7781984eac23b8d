import { mkdirSync, readdirSync, readFileSync, writeFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { fileURLToPath, pathToFileURL } from 'node:url';
import ts from 'typescript';

const ROOT = fileURLToPath(new URL('../../', import.meta.url));
const FOLDERS = ['src/errors', 'src/files', 'tests/files/workers'];

/**
 * Puts these folders of the sources as JavaScript, the way the compiler builds them, into an empty folder.
 * Threads and processes that tests start begin ten times sooner on these than on the sources.
 */
export function builtCopy(folder: string): void {
  writeFileSync(join(folder, 'package.json'), '{ "type": "module" }');
  for (const name of FOLDERS.flatMap((part) =>
    readdirSync(join(ROOT, part)).map((file) => join(part, file)),
  )) {
    if (!name.endsWith('.ts')) continue;
    const { outputText } = ts.transpileModule(readFileSync(join(ROOT, name), 'utf8'), {
      compilerOptions: {
        module: ts.ModuleKind.ESNext,
        target: ts.ScriptTarget.ES2022,
        verbatimModuleSyntax: true,
      },
    });
    const path = join(folder, name.replace(/\.ts$/, '.js'));
    mkdirSync(dirname(path), { recursive: true });
    writeFileSync(path, outputText);
  }
}

/** Address of a program of the folder `workers` in such a copy; the name is without its ending. */
export function workerIn(copy: string, name: string): URL {
  return pathToFileURL(join(copy, 'tests/files/workers', `${name}.js`));
}

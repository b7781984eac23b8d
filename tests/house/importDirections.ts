import ts from 'typescript';

/**
 * The folders of src/ from the top down; those of one row stand side by side and know nothing of one another.
 */
export const ROWS: readonly (readonly string[])[] = [
  ['cli'],
  ['files'],
  ['sheet'],
  ['figure'],
  ['tolerance', 'photon', 'drive'],
  ['program'],
  ['simulate', 'merit', 'decompose'],
  ['chip', 'target'],
  ['mesh'],
  ['matrix'],
  ['random', 'statistics', 'optimise'],
  ['kernel'],
  ['errors', 'units'],
];

/** Folders that may use the modules of Node; all others run in a browser too. */
const NODE_FOLDERS: readonly string[] = ['cli', 'files'];

/** Sources in AssemblyScript, whose imports have no ending. */
const ASSEMBLY = 'kernel/assembly/';

/**
 * Every module that a source names: imports, re-exports, `import(...)` of both kinds, `import x =
 * require(...)`.
 */
export function importedModules(path: string, source: string): string[] {
  const modules: string[] = [];
  const take = (node: ts.Node | undefined): void => {
    if (node !== undefined)
      modules.push(ts.isStringLiteralLike(node) ? node.text : `(${node.getText(file)})`);
  };
  const file = ts.createSourceFile(path, source, ts.ScriptTarget.ES2022, true);
  const visit = (node: ts.Node): void => {
    if (ts.isImportDeclaration(node) || ts.isExportDeclaration(node)) take(node.moduleSpecifier);
    else if (ts.isImportTypeNode(node)) {
      take(ts.isLiteralTypeNode(node.argument) ? node.argument.literal : node.argument);
    } else if (ts.isExternalModuleReference(node)) take(node.expression);
    else if (ts.isCallExpression(node) && loadsModule(node.expression)) take(node.arguments[0]);
    ts.forEachChild(node, visit);
  };
  visit(file);
  return modules;
}

function loadsModule(callee: ts.Expression): boolean {
  return (
    callee.kind === ts.SyntaxKind.ImportKeyword || (ts.isIdentifier(callee) && callee.text === 'require')
  );
}

/**
 * What is wrong with the imports of one file of src/.
 * @param path its path within src/, with forward slashes
 */
export function importFaults(path: string, source: string): string[] {
  const modules = importedModules(path, source);
  if (path === 'index.ts') return contentsPageFaults(source);
  const folder = folderOf(path);
  const row = rowOf(folder);
  if (row < 0) return [`${path} stands in no folder of the design`];
  return modules.flatMap((module) => {
    const fault = moduleFault(path, folder, row, module);
    return fault === undefined ? [] : [`${path}: ${module} ${fault}`];
  });
}

function moduleFault(path: string, folder: string, row: number, module: string): string | undefined {
  if (module.startsWith('(')) return 'is no fixed name';
  if (isNodeModule(module)) {
    return NODE_FOLDERS.includes(folder) ? undefined : 'is a module of Node';
  }
  if (!module.startsWith('.')) return undefined;
  if (!module.endsWith('.js') && !path.startsWith(ASSEMBLY)) return 'does not end in .js';
  const target = resolveWithin(path, module);
  const targetFolder = folderOf(target);
  if (targetFolder === folder) return undefined;
  const targetRow = rowOf(targetFolder);
  if (targetRow < 0) return 'lies outside of the folders of the design';
  if (targetRow === row) return 'lies in the same row';
  return targetRow < row ? 'points upward' : undefined;
}

/** Node's own modules, with and without `node:`. */
function isNodeModule(module: string): boolean {
  return module.startsWith('node:') || BARE_NODE_MODULES.has(module.split('/')[0]!);
}

const BARE_NODE_MODULES: ReadonlySet<string> = new Set(
  (
    'assert buffer child_process cluster crypto events fs http http2 https module net os path perf_hooks process ' +
    'readline stream timers tls tty url util v8 vm worker_threads zlib'
  ).split(' '),
);

/** The contents page holds nothing but re-exports by name. */
function contentsPageFaults(source: string): string[] {
  const file = ts.createSourceFile('index.ts', source, ts.ScriptTarget.ES2022, true);
  return file.statements.flatMap((statement) => {
    const isNamedReExport =
      ts.isExportDeclaration(statement) &&
      statement.moduleSpecifier !== undefined &&
      statement.exportClause !== undefined &&
      ts.isNamedExports(statement.exportClause);
    return isNamedReExport
      ? []
      : [`index.ts: "${statement.getText(file).split('\n')[0]}" is no named re-export`];
  });
}

function folderOf(path: string): string {
  return path.includes('/') ? path.slice(0, path.indexOf('/')) : '';
}

function rowOf(folder: string): number {
  return ROWS.findIndex((row) => row.includes(folder));
}

/** The path within src/ that a relative import of a file means; one that leaves src/ keeps its `..`. */
function resolveWithin(path: string, module: string): string {
  const parts = path.split('/').slice(0, -1);
  for (const part of module.split('/')) {
    if (part === '..' && parts.length > 0 && parts.at(-1) !== '..') parts.pop();
    else if (part !== '.') parts.push(part);
  }
  return parts.join('/');
}

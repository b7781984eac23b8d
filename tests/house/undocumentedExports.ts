import ts from 'typescript';

/** Names that a module exports, its own and re-exported ones, whose declaration has no doc comment. */
export function undocumentedExports(program: ts.Program, path: string): string[] {
  const checker = program.getTypeChecker();
  const file = program.getSourceFile(path);
  const module = file && checker.getSymbolAtLocation(file);
  if (module === undefined) throw new Error(`${path} is no module`);
  return checker
    .getExportsOfModule(module)
    .filter((symbol) => {
      const original = symbol.flags & ts.SymbolFlags.Alias ? checker.getAliasedSymbol(symbol) : symbol;
      return ts.displayPartsToString(original.getDocumentationComment(checker)).trim() === '';
    })
    .map((symbol) => symbol.name);
}

/** A program of files that live in memory, for trying the check. */
export function programInMemory(files: Readonly<Record<string, string>>): ts.Program {
  const options: ts.CompilerOptions = {
    noLib: true,
    module: ts.ModuleKind.ESNext,
    moduleResolution: ts.ModuleResolutionKind.Bundler,
  };
  const host = ts.createCompilerHost(options);
  host.fileExists = (path) => path in files;
  host.readFile = (path) => files[path];
  host.getSourceFile = (path, target) =>
    path in files ? ts.createSourceFile(path, files[path]!, target) : undefined;
  host.getCurrentDirectory = () => '/';
  return ts.createProgram(Object.keys(files), options, host);
}

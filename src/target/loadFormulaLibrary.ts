import type { Complex } from './Complex.js';
import type { FormulaLibrary } from './FormulaEvaluator.js';
import { LIBRARY_FUNCTIONS } from './formulaNames.js';
import type { FormulaValue } from './formulaValue.js';

type AnyFunction = (...given: readonly FormulaValue[]) => unknown;

/** Functions of the library that could change it, or take text as code: switched off in our instance. */
const SWITCHED_OFF = [
  ...['import', 'config', 'createUnit', 'parse', 'parser', 'compile', 'evaluate', 'simplify', 'simplifyCore'],
  ...[
    'simplifyConstant',
    'derivative',
    'rationalize',
    'resolve',
    'symbolicEqual',
    'chain',
    'unit',
    'reviver',
    'replacer',
  ],
];

let loaded: Promise<FormulaLibrary> | undefined;

/**
 * The library of formulas, loaded at the first call (about a second) and kept: a private instance of mathjs.
 */
export function loadFormulaLibrary(): Promise<FormulaLibrary> {
  loaded ??= load();
  return loaded;
}

async function load(): Promise<FormulaLibrary> {
  const { create, all } = await import('mathjs');
  if (all === undefined) throw new Error('mathjs comes without its functions');
  const instance = create(all, { matrix: 'Array', number: 'number' });
  const parse = instance.parse.bind(instance);
  const off = (): never => {
    throw new Error('this function is switched off');
  };
  instance.import(Object.fromEntries(SWITCHED_OFF.map((name) => [name, off])), { override: true });
  const byName = instance as unknown as Readonly<Record<string, unknown>>;
  return {
    parse: (text) => parse(text),
    complex: (re, im): Complex => instance.complex(re, im),
    functions: new Map(
      [...LIBRARY_FUNCTIONS.keys()].map((name): [string, AnyFunction] => [name, byName[name] as AnyFunction]),
    ),
    knownNames: new Set(Object.keys(instance)),
  };
}

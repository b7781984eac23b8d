import type {
  ArrayNode,
  ConstantNode,
  FunctionNode,
  MathNode,
  OperatorNode,
  ParenthesisNode,
  SymbolNode,
} from 'mathjs';
import { InputError } from '../errors/InputError.js';
import { nearestName } from '../errors/nearestName.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import { multiply } from '../matrix/products.js';
import type { Complex } from './Complex.js';
import { ALIASES, CONSTANTS, LIBRARY_FUNCTIONS, OPERATORS } from './formulaNames.js';
import type { FormulaValue } from './formulaValue.js';
import { checkedValue, matrixOf, nestedRows, ownArgument, sizesOf } from './formulaValue.js';
import { cut, emptyTarget } from './limits.js';
import { OWN_FUNCTIONS } from './ownFunctions.js';
import type { SizeBudget } from './SizeBudget.js';

/** The functions of the library that are used, by name; what they return is checked before it is believed. */
export interface FormulaLibrary {
  readonly parse: (text: string) => MathNode;
  readonly complex: (re: number, im: number) => Complex;
  /** Own property for each name in LIBRARY_FUNCTIONS. */
  readonly functions: ReadonlyMap<string, (...given: readonly FormulaValue[]) => unknown>;
  /** Every name that the library knows, allowed or not. */
  readonly knownNames: ReadonlySet<string>;
}

/**
 * Evaluates a parsed formula. The tree is walked here and never by the library: a node that is not on the
 * list has no way to act, and the size of every result is asked for before it is made.
 */
export class FormulaEvaluator {
  constructor(
    private readonly library: FormulaLibrary,
    private readonly budget: SizeBudget,
  ) {}

  /** The formula's matrix. @throws InputError; RangeError when the tree is too deep for the stack. */
  evaluate(text: string): ComplexMatrix {
    const tree = this.parse(text);
    this.requireAllowed(tree);
    return matrixOf(this.valueOf(tree), this.budget.maxModes);
  }

  private parse(text: string): MathNode {
    try {
      return this.library.parse(text);
    } catch (cause) {
      if (isStackOverflow(cause)) throw cause;
      const message = cause instanceof Error ? cause.message : String(cause);
      const character = /\(char (\d+)\)/.exec(message)?.[1];
      const why = cut(message.replace(/\s*\(char \d+\)/, ''), 80);
      throw new InputError(
        'target/syntax',
        `the formula cannot be read${character === undefined ? '' : ` at character ${character}`}: ${why}`,
        'Mend it there; a matrix is written [1, 0; 0, 1], and * stands between factors.',
        {},
        { cause },
      );
    }
  }

  /** Checks every node before any is evaluated. */
  private requireAllowed(node: MathNode): void {
    switch (node.type) {
      case 'ConstantNode':
        requireNumber((node as ConstantNode).value);
        return;
      case 'SymbolNode':
        this.requireConstant((node as SymbolNode).name);
        return;
      case 'OperatorNode':
        requireOperator(node as OperatorNode);
        refuseAmbiguous(node as OperatorNode);
        break;
      case 'FunctionNode':
        this.requireFunction((node as FunctionNode).fn);
        break;
      case 'ArrayNode':
      case 'ParenthesisNode':
        break;
      default:
        throw notAllowed(FORBIDDEN_NODES.get(node.type) ?? 'this construction');
    }
    for (const child of childrenOf(node)) this.requireAllowed(child);
  }

  private requireConstant(name: string): void {
    if (CONSTANTS.has(name)) return;
    if (isFunction(name)) {
      throw new InputError(
        'target/argument',
        `"${name}" is a function, and stands here without arguments`,
        `Call it: ${OWN_FUNCTIONS.get(name)?.usage ?? `${name}(...)`}.`,
      );
    }
    throw this.unknown(name, [...CONSTANTS.keys(), ...functionNames()]);
  }

  private requireFunction(callee: MathNode): void {
    if (callee.type !== 'SymbolNode') throw notAllowed('a call of something that is not a name');
    const { name } = callee as SymbolNode;
    if (isFunction(name)) return;
    if (!CONSTANTS.has(name)) throw this.unknown(name, functionNames());
    throw new InputError('target/argument', `"${name}" is not a function`, 'Write * between factors.');
  }

  private unknown(name: string, known: readonly string[]): InputError {
    // Of one letter every other is as near as the next.
    const near = name.length > 1 ? nearestName(name, known) : undefined;
    const forbidden = this.library.knownNames.has(name);
    return new InputError(
      forbidden ? 'target/forbidden' : 'target/unknown-name',
      forbidden ? `"${cut(name)}" may not be used in a formula` : `the name "${cut(name)}" is unknown`,
      near === undefined
        ? 'Use numbers, i, pi, e, dft, haar, hadamard, permutation, splitter, direct, kron, expm, inv, and the usual functions.'
        : `Did you mean ${near}?`,
    );
  }

  private valueOf(node: MathNode): FormulaValue {
    switch (node.type) {
      case 'ConstantNode':
        return checkedValue((node as ConstantNode).value, 'the formula');
      case 'SymbolNode': {
        const { re, im } = CONSTANTS.get((node as SymbolNode).name)!;
        return im === 0 ? re : this.library.complex(re, im);
      }
      case 'ParenthesisNode':
        return this.valueOf((node as ParenthesisNode).content);
      case 'ArrayNode':
        return this.arrayOf((node as ArrayNode).items.map((item) => this.valueOf(item)));
      case 'OperatorNode':
        return this.call((node as OperatorNode).fn, (node as OperatorNode).args);
      default:
        return this.call((node as FunctionNode).fn.name, (node as FunctionNode).args);
    }
  }

  private arrayOf(items: readonly FormulaValue[]): FormulaValue {
    this.budget.spend([items.length, ...sizesOf(items[0] ?? 0)]);
    return checkedValue(items, 'a matrix');
  }

  private call(name: string, nodes: readonly MathNode[]): FormulaValue {
    const given = nodes.map((node) => this.valueOf(node));
    const own = OWN_FUNCTIONS.get(name);
    if (own !== undefined) {
      const wantsList = name === 'permutation';
      const matrix = own.make(
        given.map((value) => ownArgument(value, wantsList)),
        this.budget,
      );
      return nestedRows(matrix, this.library.complex);
    }
    if (name === 'cis')
      return this.callLibrary('exp', [this.callLibrary('multiply', [this.library.complex(0, 1), ...given])]);
    return this.callLibrary(ALIASES.get(name) ?? name, given);
  }

  private callLibrary(name: string, given: readonly FormulaValue[]): FormulaValue {
    LIBRARY_FUNCTIONS.get(name)!(given, this.budget);
    const product = name === 'multiply' ? this.matrixProduct(given) : undefined;
    if (product !== undefined) return product;
    const value = checkedValue(this.attempt(name, given), name);
    this.budget.requireSize(sizesOf(value));
    return value;
  }

  /** Two matrices are multiplied here: the library's product takes a hundred times as long. */
  private matrixProduct(given: readonly FormulaValue[]): FormulaValue | undefined {
    const [left, right] = given.map(sizesOf);
    const ours = given.length === 2 && left?.length === 2 && right?.length === 2 && left[1] === right[0];
    if (!ours) return undefined;
    const [a, b] = given.map((value) => ownArgument(value, false));
    const matrix = multiply(a as ComplexMatrix, b as ComplexMatrix);
    return checkedValue(nestedRows(matrix, this.library.complex), 'multiply');
  }

  private attempt(name: string, given: readonly FormulaValue[]): unknown {
    // In a formula dimensions count from 1, in the library from 0.
    const last = given.at(-1);
    const passed = name === 'concat' && typeof last === 'number' ? [...given.slice(0, -1), last - 1] : given;
    try {
      return this.library.functions.get(name)!(...passed);
    } catch (cause) {
      if (cause instanceof InputError || isStackOverflow(cause)) throw cause;
      const message = cause instanceof Error ? cause.message : String(cause);
      throw new InputError(
        'target/argument',
        `${name}: ${cut(message.replace(/ To call it elementwise.*$| \(try increasing .*$/, ''), 160)}`,
        'Check the number, the kind and the sizes of its arguments; of a matrix, e^A is expm(A).',
        {},
        { cause },
      );
    }
  }
}

function requireNumber(value: unknown): void {
  if (value === undefined) throw emptyTarget();
  if (typeof value !== 'number') throw notAllowed('text or a truth value');
}

function requireOperator(node: OperatorNode): void {
  if (!OPERATORS.has(node.fn)) throw notAllowed(`the operator ${String(node.op)}`);
}

/**
 * True for the error of an exhausted stack, which is a RangeError as the library's own errors about sizes
 * are.
 */
export function isStackOverflow(error: unknown): boolean {
  return error instanceof RangeError && /call stack/i.test(error.message);
}

const FORBIDDEN_NODES: ReadonlyMap<string, string> = new Map([
  ['AccessorNode', 'access to a property or an entry'],
  ['AssignmentNode', 'an assignment'],
  ['BlockNode', 'several statements'],
  ['ConditionalNode', 'a condition'],
  ['FunctionAssignmentNode', 'the definition of a function'],
  ['IndexNode', 'an index'],
  ['ObjectNode', 'an object'],
  ['RangeNode', 'a range'],
  ['RelationalNode', 'a comparison'],
]);

function notAllowed(what: string): InputError {
  return new InputError(
    'target/forbidden',
    `a formula cannot hold ${what}`,
    "Use numbers, names, functions, the operators + - * / ^ ' and matrices in brackets.",
  );
}

/**
 * `1/2i` is i/2 to the library and -i/2 in most languages; `1/sqrt(2) [1,1;1,-1]` puts the matrix into the
 * divisor.
 * @throws InputError `target/ambiguous`.
 */
function refuseAmbiguous(node: OperatorNode): void {
  const [left, right] = node.args as readonly (MathNode | undefined)[];
  const divides = isOperator(node, 'divide') && isJoined(right);
  const divided = isJoined(node) && isOperator(left, 'divide');
  const powerOfUnit = isJoined(node) && left?.type === 'ConstantNode' && isPowerOfUnit(right);
  if (!(divides || divided || powerOfUnit)) return;
  throw new InputError(
    'target/ambiguous',
    `"${cut(node.toString())}" can be read in two ways`,
    'Write * between factors and put parentheses: (1/2)*i or 1/(2*i), (2*i)^2 or 2*(i^2).',
  );
}

function isOperator(node: MathNode | undefined, fn: string): node is OperatorNode {
  return node?.type === 'OperatorNode' && (node as OperatorNode).fn === fn;
}

/** A product without a sign between its factors. */
function isJoined(node: MathNode | undefined): boolean {
  return isOperator(node, 'multiply') && node.implicit;
}

function isPowerOfUnit(node: MathNode | undefined): boolean {
  if (!isOperator(node, 'pow')) return false;
  const base = node.args[0] as MathNode;
  return base.type === 'SymbolNode' && /^[ij]$/.test((base as SymbolNode).name);
}

function childrenOf(node: MathNode): readonly MathNode[] {
  if (node.type === 'ArrayNode') return (node as ArrayNode).items;
  if (node.type === 'ParenthesisNode') return [(node as ParenthesisNode).content];
  return (node as OperatorNode | FunctionNode).args;
}

function isFunction(name: string): boolean {
  return OWN_FUNCTIONS.has(name) || LIBRARY_FUNCTIONS.has(name) || ALIASES.has(name) || name === 'cis';
}

function functionNames(): readonly string[] {
  return [...OWN_FUNCTIONS.keys(), ...LIBRARY_FUNCTIONS.keys(), ...ALIASES.keys(), 'cis'];
}

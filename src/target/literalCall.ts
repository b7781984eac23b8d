import { InputError } from '../errors/InputError.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import type { Complex } from './Complex.js';
import { evaluateScalar } from './evaluateScalar.js';
import type { OwnArgument } from './ownFunctions.js';
import { OWN_FUNCTIONS } from './ownFunctions.js';
import type { SizeBudget } from './SizeBudget.js';

/** A call of one of our functions whose arguments are numbers, lists of numbers, or such calls. */
export interface LiteralCall {
  readonly name: string;
  readonly given: readonly (LiteralCall | Complex | readonly Complex[])[];
}

/**
 * The text as a call of ours with literal arguments (`direct(dft(2), haar(3, 7))`), or undefined when it is
 * anything else, which is no error: a formula in general then. Nothing is computed but the numbers. Cost:
 * length times depth.
 */
export function parseLiteralCall(text: string): LiteralCall | undefined {
  const found = /^\s*([A-Za-z_]\w*)\s*\(([^]*)\)\s*$/.exec(text);
  if (found === null || !OWN_FUNCTIONS.has(found[1]!)) return undefined;
  const parts = splitAtCommas(found[2]!);
  if (parts === undefined) return undefined;
  const given = [];
  for (const part of parts) {
    const argument = parseLiteralCall(part) ?? listOfNumbers(part) ?? scalar(part);
    if (argument === undefined) return undefined;
    given.push(argument);
  }
  return { name: found[1]!, given };
}

/** The matrix that the call stands for. @throws InputError as the functions called do. */
export function makeLiteralCall(call: LiteralCall, budget: SizeBudget): ComplexMatrix {
  const given = call.given.map((argument): OwnArgument =>
    'name' in argument ? makeLiteralCall(argument, budget) : argument,
  );
  return OWN_FUNCTIONS.get(call.name)!.make(given, budget);
}

/** Parts between commas outside of all brackets; undefined when the brackets do not match. */
function splitAtCommas(text: string): string[] | undefined {
  if (text.trim() === '') return [];
  const parts: string[] = [];
  const open: string[] = [];
  let from = 0;
  for (let k = 0; k < text.length; k++) {
    const character = text[k]!;
    if (character === '(') open.push(')');
    else if (character === '[') open.push(']');
    else if (character === ')' || character === ']') {
      if (open.pop() !== character) return undefined;
    } else if (character === ',' && open.length === 0) {
      parts.push(text.slice(from, k));
      from = k + 1;
    }
  }
  parts.push(text.slice(from));
  return open.length === 0 ? parts : undefined;
}

function listOfNumbers(text: string): readonly Complex[] | undefined {
  const inside = /^\s*\[([^[\]]*)\]\s*$/.exec(text)?.[1];
  const parts = inside === undefined ? undefined : splitAtCommas(inside);
  const numbers = parts?.map(scalar);
  return numbers?.every((number) => number !== undefined) === true ? numbers : undefined;
}

function scalar(text: string): Complex | undefined {
  try {
    const value = evaluateScalar(text);
    return Number.isFinite(value.re) && Number.isFinite(value.im) ? value : undefined;
  } catch (error) {
    if (error instanceof InputError) return undefined;
    throw error;
  }
}

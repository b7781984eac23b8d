import type { z } from 'zod';
import { nearestName } from './nearestName.js';

type Issue = z.core.$ZodIssue;

/** One fault of a document, in words. */
export interface DescribedIssue {
  /** Path of the field, such as `measuredCells[2].couplingRatio[0]`; empty for the whole document. */
  readonly field: string;
  readonly what: string;
  readonly remedy: string;
}

/** A path as it is written in JavaScript and jq: keys with dots, places in a list (from 0) in brackets. */
function fieldPath(path: readonly PropertyKey[]): string {
  return path.reduce<string>((text, key) => {
    if (typeof key === 'number') return `${text}[${key}]`;
    return text === '' ? String(key) : `${text}.${String(key)}`;
  }, '');
}

/**
 * Puts the first fault that a schema found in a document into words: the field's path, what stands there,
 * what is expected, and for an unknown key or word the nearest known one.
 */
export function describeIssue(
  schema: z.ZodType,
  document: unknown,
  issues: readonly Issue[],
): DescribedIssue {
  // A misspelt key is the reason for the one that is missing, so it is told first.
  const issue = innermost(issues.find(({ code }) => code === 'unrecognized_keys') ?? issues[0]!);
  if (issue.code === 'unrecognized_keys') {
    const [key] = issue.keys;
    return {
      field: fieldPath([...issue.path, key!]),
      what: 'unknown key',
      remedy: suggestion(key!, keysAt(schema, issue.path)),
    };
  }
  const field = fieldPath(issue.path);
  const found = valueAt(document, issue.path);
  const expected = expectation(issue);
  if (found === undefined) return { field, what: 'is missing', remedy: `Give ${expected}.` };
  const what = `${shown(found)} is not ${expected}`;
  if (issue.code === 'invalid_value' && typeof found === 'string') {
    return { field, what, remedy: suggestion(found, issue.values.map(String)) };
  }
  return { field, what, remedy: `Put ${expected} there.` };
}

/** A union's issue holds those of its branches: the one that came furthest tells most. */
function innermost(issue: Issue): Issue {
  if (issue.code !== 'invalid_union') return issue;
  const branches = issue.errors.map((branch) => branch[0]).filter((first) => first !== undefined);
  const furthest = branches.reduce((best, next) => (next.path.length > best.path.length ? next : best));
  return innermost({ ...furthest, path: [...issue.path, ...furthest.path] });
}

function expectation(issue: Issue): string {
  switch (issue.code) {
    case 'invalid_type':
      return TYPE_NAMES[issue.expected] ?? `a ${issue.expected}`;
    case 'invalid_value':
      return issue.values.length === 1
        ? String(issue.values[0])
        : `one of ${issue.values.map(String).join(', ')}`;
    case 'too_small':
      return `${sized(issue.origin)} ${issue.minimum} or more${unitOf(issue.origin)}`;
    case 'too_big':
      return `${sized(issue.origin)} at most ${issue.maximum}${unitOf(issue.origin)}`;
    default:
      return issue.message;
  }
}

const TYPE_NAMES: Readonly<Record<string, string>> = {
  int: 'a whole number',
  array: 'a list',
  tuple: 'a list',
  object: 'an object in braces',
  string: 'a text in quotes',
  boolean: 'true or false',
};

function sized(origin: string): string {
  return origin === 'array' ? 'a list of' : origin === 'string' ? 'a text of' : 'a number of';
}

function unitOf(origin: string): string {
  return origin === 'array' ? ' entries' : origin === 'string' ? ' letters' : '';
}

function suggestion(name: string, known: readonly string[]): string {
  const near = nearestName(name, known);
  return near === undefined ? `Known here: ${known.join(', ')}.` : `Did you mean ${near}?`;
}

function shown(value: unknown): string {
  const text = JSON.stringify(value) ?? String(value);
  return text.length > 40 ? `${text.slice(0, 40)}...` : text;
}

function valueAt(document: unknown, path: readonly PropertyKey[]): unknown {
  return path.reduce<unknown>(
    (value, key) =>
      typeof value === 'object' && value !== null && Object.hasOwn(value, key)
        ? (value as Record<PropertyKey, unknown>)[key]
        : undefined,
    document,
  );
}

interface SchemaParts {
  readonly shape?: Readonly<Record<string, SchemaNode>>;
  readonly innerType?: SchemaNode;
  readonly element?: SchemaNode;
}
interface SchemaNode {
  readonly def: SchemaParts;
}

/** The keys that the object at a path of the schema may have. */
function keysAt(schema: z.ZodType, path: readonly PropertyKey[]): readonly string[] {
  const unwrapped = (node: SchemaNode | undefined): SchemaNode | undefined =>
    node?.def.innerType ? unwrapped(node.def.innerType) : node;
  const found = path.reduce<SchemaNode | undefined>(
    (node, key) => unwrapped(typeof key === 'number' ? node?.def.element : node?.def.shape?.[String(key)]),
    unwrapped(schema as unknown as SchemaNode),
  );
  return Object.keys(found?.def.shape ?? {});
}

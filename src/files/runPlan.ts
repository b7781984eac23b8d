import { readFile } from 'node:fs/promises';

/** What identifies a run whose chunks are kept. */
export interface RunPlan {
  readonly runId: string;
  /** Values in a row of a chunk. */
  readonly columns: number;
  /** Inputs and options as JSON data, so that a refusal can say what has changed. */
  readonly description?: unknown;
}

const FORMAT = 1;

/** The plan as the text of a JSON file. */
export function formatRunPlan({ runId, columns, description }: RunPlan): string {
  return `${JSON.stringify({ format: FORMAT, runId, columns, description }, null, 2)}\n`;
}

/** The plan in a file, or undefined when there is none that can be understood. */
export async function readRunPlan(path: string): Promise<RunPlan | undefined> {
  try {
    const plan = JSON.parse(await readFile(path, 'utf8')) as Partial<RunPlan> & { readonly format?: unknown };
    if (plan.format !== FORMAT || typeof plan.runId !== 'string' || typeof plan.columns !== 'number') {
      return undefined;
    }
    return { runId: plan.runId, columns: plan.columns, description: plan.description };
  } catch {
    return undefined;
  }
}

/**
 * What differs between the descriptions of two runs, in words: at most three keys of theirs; empty when
 * nothing can be named.
 */
export function planDifferences(earlier: RunPlan, now: RunPlan): string {
  const [before, after] = [asRecord(earlier.description), asRecord(now.description)];
  const keys = [...new Set([...Object.keys(before), ...Object.keys(after)])];
  return keys
    .filter((key) => JSON.stringify(before[key]) !== JSON.stringify(after[key]))
    .slice(0, 3)
    .map((key) => `${key} was ${shown(before[key])} and is ${shown(after[key])}`)
    .join(', ');
}

function asRecord(value: unknown): Readonly<Record<string, unknown>> {
  return typeof value === 'object' && value !== null ? (value as Record<string, unknown>) : {};
}

function shown(value: unknown): string {
  const text = value === undefined ? 'not given' : JSON.stringify(value);
  return text.length > 40 ? `${text.slice(0, 40)}...` : text;
}

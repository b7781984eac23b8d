import { InputError } from '../errors/InputError.js';

/** What the pool sends to a worker. */
export interface JobMessage {
  readonly index: number;
  readonly job: unknown;
}

/** What a worker sends back: the result, or why there is none. */
export type ReplyMessage =
  { readonly index: number; readonly result: unknown } | { readonly index: number; readonly fault: Fault };

/** An error as plain data: classes do not survive the way between threads. */
export interface Fault {
  /** Code and remedy of an `InputError`. */
  readonly input?: { readonly code: string; readonly remedy: string };
  readonly message: string;
  readonly stack?: string;
}

/** An error as plain data. */
export function faultOf(error: unknown): Fault {
  if (error instanceof InputError) {
    return { input: { code: error.code, remedy: error.remedy }, message: error.message };
  }
  if (!(error instanceof Error)) return { message: String(error) };
  return { message: error.message, ...(error.stack === undefined ? {} : { stack: error.stack }) };
}

/** The error again: an `InputError` as it was, anything else with the job's name before its message. */
export function errorOf({ input, message, stack }: Fault, jobName: string): Error {
  if (input !== undefined) return new InputError(input.code, message, input.remedy);
  const cause = new Error(message);
  if (stack !== undefined) cause.stack = stack;
  return new Error(`${jobName} failed: ${message}`, { cause });
}

import { createColors } from 'picocolors';
import type { OutputOptions } from './commandOptions.js';

/** Writes a command's result to standard output and its messages to standard error. */
export interface Console {
  /** Part of the result in words. */
  result(text: string): void;
  /** A message beside the result. */
  message(text: string): void;
  /** A message that something is not as wanted. */
  warning(text: string): void;
  /** Whether a line of progress may be drawn: on a terminal, without --quiet. */
  readonly showsProgress: boolean;
}

/** A line without control characters: names and paths come from files, and must not steer the terminal. */
export function withoutControls(line: string): string {
  return line.replace(/[\p{Cc}\p{Bidi_Control}\u2028\u2029]+/gu, ' ');
}

/**
 * Colours for standard error: on a terminal, without NO_COLOR. The stream's isTTY is undefined where it is a pipe or
 * a file, which picocolors would take for "decide yourself", and it would colour the logs of a CI server.
 */
export function errorColours(): ReturnType<typeof createColors> {
  return createColors(Boolean(process.stderr.isTTY) && !process.env['NO_COLOR']);
}

/** With --json words give way to the report; with --quiet nothing but errors and the report is printed. */
export function createConsole({ json, quiet }: OutputOptions): Console {
  const colours = errorColours();
  const print = (stream: NodeJS.WriteStream, text: string, before = ''): void => {
    stream.write(`${before}${text.split('\n').map(withoutControls).join('\n')}\n`);
  };
  return {
    showsProgress: process.stderr.isTTY && quiet !== true,
    result: (text) => {
      if (json !== true && quiet !== true) print(process.stdout, text);
    },
    message: (text) => {
      if (quiet !== true) print(process.stderr, text);
    },
    warning: (text) => {
      if (quiet !== true) print(process.stderr, text, `${colours.yellow('note')}: `);
    },
  };
}

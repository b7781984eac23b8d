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
}

/** With --json words give way to the report; with --quiet nothing but errors and the report is printed. */
export function createConsole({ json, quiet }: OutputOptions): Console {
  const colours = createColors(process.stderr.isTTY && !process.env['NO_COLOR']);
  const print = (stream: NodeJS.WriteStream, text: string): void => {
    stream.write(`${text}\n`);
  };
  return {
    result: (text) => {
      if (json !== true && quiet !== true) print(process.stdout, text);
    },
    message: (text) => {
      if (quiet !== true) print(process.stderr, text);
    },
    warning: (text) => {
      if (quiet !== true) print(process.stderr, `${colours.yellow('note')}: ${text}`);
    },
  };
}

import { decodeText } from './decodeText.js';
import { InputError } from './InputError.js';

/** Levels of brackets that are followed: documents of this program have fewer than ten. */
const MAX_DEPTH = 32;

/**
 * Parses JSON from bytes (UTF-8, a byte order mark allowed).
 * @throws InputError `input/not-text`, and what `parseJsonText` throws
 */
export function parseJson(bytes: Uint8Array): unknown {
  return parseJsonText(decodeText(bytes));
}

/**
 * Parses JSON.
 * @throws InputError `input/empty`, `input/too-deep`, `input/not-finite` for NaN and Infinity, which JSON
 * cannot write, or `input/not-json` with the line and the character where the text stops being JSON, when the
 * engine tells them
 */
export function parseJsonText(text: string): unknown {
  if (text.trim() === '') {
    throw new InputError('input/empty', 'there is nothing in it', 'Give a JSON document.');
  }
  requireShallow(text);
  try {
    return JSON.parse(text);
  } catch (cause) {
    if (/[[,:]\s*-?(?:NaN|Infinity)\b/.test(text)) {
      throw new InputError(
        'input/not-finite',
        'a number is NaN or Infinity, which JSON has no way to write',
        'Every number must be finite.',
        {},
        { cause },
      );
    }
    throw new InputError(
      'input/not-json',
      `this is not JSON: ${reason(cause, text)}`,
      'Look there for a missing or superfluous comma, quotation mark or bracket.',
      {},
      { cause },
    );
  }
}

function reason(cause: unknown, text: string): string {
  const message = cause instanceof Error ? cause.message : String(cause);
  const position = /at position (\d+)/.exec(message)?.[1];
  const bare = message.replace(/ in JSON at position \d+.*$|,? "[^]*$| at position \d+.*$/, '').slice(0, 80);
  if (position === undefined) return bare;
  const lines = text.slice(0, Number(position)).split('\n');
  return `${bare} at line ${lines.length}, character ${lines.at(-1)!.length + 1}`;
}

/** Bounds the nesting by a scan of the text, since the parser itself calls itself for every level. */
function requireShallow(text: string): void {
  let depth = 0;
  let inString = false;
  for (let k = 0; k < text.length; k++) {
    const character = text.charCodeAt(k);
    if (inString) {
      if (character === 0x5c) k++;
      else if (character === 0x22) inString = false;
    } else if (character === 0x22) inString = true;
    else if (character === 0x5b || character === 0x7b) depth++;
    else if (character === 0x5d || character === 0x7d) depth--;
    if (depth > MAX_DEPTH) {
      throw new InputError(
        'input/too-deep',
        `the JSON is nested more than ${MAX_DEPTH} levels deep`,
        'No document of this program is; a matrix is an array of rows, each an array of entries.',
      );
    }
  }
}

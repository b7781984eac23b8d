import { InputError } from '../errors/InputError.js';

/**
 * A range of ports as a person writes it, `3-6`: first and last port, counted from 1, both included.
 * @throws InputError `target/ports`.
 */
export function parsePorts(text: string): readonly [first: number, last: number] {
  const found = /^\s*(\d{1,6})\s*[-\u2013]\s*(\d{1,6})\s*$/.exec(text);
  const first = Number(found?.[1] ?? NaN);
  const last = Number(found?.[2] ?? NaN);
  if (first >= 1 && first <= last) return [first, last];
  throw new InputError(
    'target/ports',
    `"${text.slice(0, 40)}" is not a range of ports`,
    'Write the first and the last port, counted from 1, such as 3-6.',
  );
}

/** Longest list of ports that is read. */
const MOST_PORTS = 1024;

/**
 * A list of ports as a person writes it, `1,3` or `2-5,8`: ports counted from 1, each once.
 * @returns indices from 0, in rising order
 * @throws InputError `target/ports`
 */
export function parsePortList(text: string): readonly number[] {
  const ports = new Set<number>();
  for (const part of text.split(',')) {
    const single = /^\s*(\d{1,6})\s*$/.exec(part);
    const [first, last] = single ? [Number(single[1]), Number(single[1])] : parsePorts(part);
    if (!(first >= 1 && last <= MOST_PORTS)) {
      throw new InputError(
        'target/ports',
        `there is no port ${first >= 1 ? last : first}`,
        `Ports are counted from 1, up to ${MOST_PORTS}.`,
      );
    }
    for (let port = first; port <= last; port++) {
      if (ports.has(port)) {
        throw new InputError(
          'target/ports',
          `port ${port} is listed twice in "${text.slice(0, 40)}"`,
          'Name each port once.',
        );
      }
      ports.add(port);
    }
  }
  return Array.from(ports, (port) => port - 1).sort((a, b) => a - b);
}

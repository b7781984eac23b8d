/** An element of a document that `readXml` has read. */
export interface XmlElement {
  readonly name: string;
  readonly attributes: ReadonlyMap<string, string>;
  readonly children: XmlElement[];
  readonly parent: XmlElement | null;
  text: string;
}

const NAME = /^[A-Za-z_][A-Za-z0-9_.:-]*/;
const ENTITIES: Readonly<Record<string, string>> = { lt: '<', gt: '>', amp: '&', quot: '"', apos: "'" };
/** XML 1.0 (fifth edition), production 2: what is not a Char. */
const NOT_A_CHAR = /[^\t\n\r\u{20}-\u{d7ff}\u{e000}-\u{fffd}\u{10000}-\u{10ffff}]/u;

/** Reads the subset of XML that a figure uses, strictly; throws on anything that is not well-formed. */
export function readXml(source: string): XmlElement {
  if (NOT_A_CHAR.test(source)) throw new Error('a character that XML does not allow');
  let at = 0;
  let current: XmlElement | null = null;
  let root: XmlElement | null = null;
  while (at < source.length) {
    const open = source.indexOf('<', at);
    const text = source.slice(at, open < 0 ? source.length : open);
    if (current) current.text += decode(text);
    else if (text.trim() !== '') throw new Error(`text outside the root: ${text}`);
    if (open < 0) break;
    const close = endOfTag(source, open);
    const tag = source.slice(open + 1, close);
    at = close + 1;
    if (tag.startsWith('/')) {
      if (current?.name !== tag.slice(1)) throw new Error(`</${tag.slice(1)}> closes <${current?.name}>`);
      current = current.parent;
      continue;
    }
    const empty = tag.endsWith('/');
    const element = readTag(empty ? tag.slice(0, -1) : tag, current);
    if (current) current.children.push(element);
    else if (root) throw new Error('two roots');
    else root = element;
    if (!empty) current = element;
  }
  if (current || !root) throw new Error('an element is not closed');
  return root;
}

/** All elements of a document, in its order. */
export function allElements(root: XmlElement): XmlElement[] {
  return [root, ...root.children.flatMap(allElements)];
}

/** The value that an element has for an attribute, its own or inherited. */
export function inherited(element: XmlElement, attribute: string): string | undefined {
  for (let at: XmlElement | null = element; at; at = at.parent) {
    const value = at.attributes.get(attribute);
    if (value !== undefined) return value;
  }
  return undefined;
}

function endOfTag(source: string, open: number): number {
  let quoted = false;
  for (let at = open + 1; at < source.length; at++) {
    if (source[at] === '"') quoted = !quoted;
    else if (source[at] === '<') throw new Error('a bare < in a tag');
    else if (source[at] === '>' && !quoted) return at;
  }
  throw new Error('a tag is not closed');
}

function readTag(tag: string, parent: XmlElement | null): XmlElement {
  const name = NAME.exec(tag)?.[0];
  if (name === undefined) throw new Error(`not a tag: ${tag}`);
  const attributes = new Map<string, string>();
  let rest = tag.slice(name.length);
  while (rest.trim() !== '') {
    const match = /^\s+([A-Za-z_][A-Za-z0-9_.:-]*)="([^"]*)"/.exec(rest);
    if (!match) throw new Error(`not an attribute: ${rest}`);
    if (attributes.has(match[1]!)) throw new Error(`${match[1]} twice`);
    attributes.set(match[1]!, decode(match[2]!));
    rest = rest.slice(match[0].length);
  }
  return { name, attributes, children: [], parent, text: '' };
}

function decode(text: string): string {
  return text.replace(/&([a-z]*;?)/g, (_, body: string) => {
    const value = body.endsWith(';') ? ENTITIES[body.slice(0, -1)] : undefined;
    if (value === undefined) throw new Error(`a bare & before ${body}`);
    return value;
  });
}

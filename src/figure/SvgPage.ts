import type { Element } from '@svgdotjs/svg.js';
import { Svg, withWindow } from '@svgdotjs/svg.js';
import { createSVGWindow } from 'svgdom';
import { printableText } from './printableText.js';

export type Attributes = Readonly<Record<string, string | number>>;

/** A length in millimetres, rounded to a micrometre: shorter files, and the same digits everywhere. */
export function rounded(length: number): number {
  return Math.round(length * 1000) / 1000 + 0;
}

function asText(attributes: Attributes): Record<string, string> {
  return Object.fromEntries(
    Object.entries(attributes).map(([key, value]) => [
      key,
      typeof value === 'number' ? String(rounded(value)) : value,
    ]),
  );
}

/** An element of an SVG document under construction, or the document itself. */
export class SvgPart {
  readonly #element: Element;

  constructor(element: Element) {
    this.#element = element;
  }

  /** A new last child; numbers among the attributes are rounded to 1/1000. */
  add(name: string, attributes: Attributes = {}): SvgPart {
    const child = this.#element.element(name);
    child.attr(asText(attributes));
    return new SvgPart(child);
  }

  /** A new last child that holds nothing but text; markup in the text stays text. */
  addText(name: string, text: string, attributes: Attributes = {}): SvgPart {
    const child = this.add(name, attributes);
    child.#element.words(printableText(text));
    return child;
  }
}

/**
 * The text of an SVG document that `draw` has filled; the root's attributes are asked for afterwards, when
 * sizes are known. Each call builds in a window of its own, so that no call leaves traces in the next.
 */
export function svgText(draw: (page: SvgPart) => void, rootAttributes: () => Attributes): string {
  const window = createSVGWindow();
  return withWindow(window, () => {
    const root = new Svg(window.document.documentElement);
    draw(new SvgPart(root));
    root.attr(asText(rootAttributes()));
    return `${root.svg()}\n`;
  });
}

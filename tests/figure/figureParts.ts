import type { CellStyle, Chip } from '../../src/chip/Chip.js';
import { EXTERNAL_GUIDES, INTERNAL_ARMS, SPLITTER_COUNTS, SPLITTER_FORMS } from '../../src/chip/Chip.js';
import type { Settings } from '../../src/chip/Settings.js';
import { dejaVuWidth } from './dejaVuWidths.js';
import type { XmlElement } from './readXml.js';
import { allElements, inherited } from './readXml.js';

/** All 48 cell styles. */
export const STYLES: readonly CellStyle[] = SPLITTER_COUNTS.flatMap((splitters) =>
  SPLITTER_FORMS.flatMap((splitterForm) =>
    EXTERNAL_GUIDES.flatMap((external) =>
      INTERNAL_ARMS.map((internal) => ({ internal, external, splitterForm, splitters })),
    ),
  ),
);

/** Settings full of wide numbers and of edge values: theta in [0, pi], the other phases in [0, 2 pi). */
export function someSettings(chip: Chip, salt = 1): Settings {
  const edges = [0, 0.5, 0.392, 1];
  const phases = (count: number, range: number, shift: number): Float64Array =>
    Float64Array.from({ length: count }, (_, i) => {
      const golden = ((i + 1) * 0.6180339887 + 0.377 * shift + 0.113 * salt) % 1;
      return i % 7 === 3 ? edges[(i + salt) % 4]! * Math.PI : golden * range;
    });
  return {
    external: phases(chip.mesh.cells, 2 * Math.PI, 1),
    internal: phases(chip.mesh.cells, Math.PI, 2),
    port: chip.portShifters ? phases(chip.mesh.modes, 2 * Math.PI, 3) : null,
  };
}

export interface Box {
  readonly what: string;
  readonly left: number;
  readonly right: number;
  readonly top: number;
  readonly bottom: number;
}

export function numberOf(element: XmlElement, attribute: string): number {
  const value = inherited(element, attribute);
  if (value === undefined || !Number.isFinite(Number(value)))
    throw new Error(`${element.name} ${attribute}=${value}`);
  return Number(value);
}

/**
 * The box of a line of text set in DejaVu Sans: digits and capitals 0.73 em high, ascenders 0.76, descenders
 * 0.24.
 */
export function textBox(text: XmlElement): Box {
  const size = numberOf(text, 'font-size');
  const width = dejaVuWidth(text.text, size, inherited(text, 'font-weight') === 'bold');
  const x = numberOf(text, 'x');
  const y = numberOf(text, 'y');
  const anchor = inherited(text, 'text-anchor') ?? 'start';
  const left = anchor === 'start' ? x : anchor === 'middle' ? x - width / 2 : x - width;
  const isNumber = /^[−0-9.π]+$/.test(text.text);
  return {
    what: text.text,
    left,
    right: left + width,
    top: y - (isNumber ? 0.73 : 0.76) * size,
    bottom: y + (isNumber ? 0.02 : 0.24) * size,
  };
}

export function blockBox(rect: XmlElement): Box {
  const [left, top] = [numberOf(rect, 'x'), numberOf(rect, 'y')];
  const what = `block of ${rect.parent?.attributes.get('id')}`;
  return { what, left, right: left + numberOf(rect, 'width'), top, bottom: top + numberOf(rect, 'height') };
}

export function overlap(one: Box, other: Box): boolean {
  return one.left < other.right && other.left < one.right && one.top < other.bottom && other.top < one.bottom;
}

export const ofClass = (root: XmlElement, name: string): XmlElement[] =>
  allElements(root).filter((element) => element.attributes.get('class') === name);

export const named = (root: XmlElement, name: string): XmlElement[] =>
  allElements(root).filter((element) => element.name === name);

export const byId = (root: XmlElement, id: string): XmlElement => {
  const found = allElements(root).filter((element) => element.attributes.get('id') === id);
  if (found.length !== 1) throw new Error(`${found.length} elements have the id ${id}`);
  return found[0]!;
};

type Point = readonly [x: number, y: number];

/** The guides as fine polylines, one per port from the top. */
export function guidePolylines(root: XmlElement): Point[][] {
  const data = byId(root, 'guides').attributes.get('d')!;
  const guides: Point[][] = [];
  for (const [, command, rest] of data.matchAll(/([MHC])([^MHC]*)/g)) {
    const values = rest!.split(' ').map(Number);
    const guide = guides.at(-1);
    if (command === 'M') guides.push([[values[0]!, values[1]!]]);
    else if (command === 'H') guide!.push([values[0]!, guide!.at(-1)![1]]);
    else guide!.push(...curvePoints(guide!.at(-1)!, values));
  }
  return guides;
}

function curvePoints([x0, y0]: Point, [x1, y1, x2, y2, x3, y3]: readonly number[]): Point[] {
  return Array.from({ length: 12 }, (_, i) => {
    const t = (i + 1) / 12;
    const s = 1 - t;
    const mix = (a: number, b: number, c: number, d: number): number =>
      s ** 3 * a + 3 * s * s * t * b + 3 * s * t * t * c + t ** 3 * d;
    return [mix(x0, x1!, x2!, x3!), mix(y0, y1!, y2!, y3!)];
  });
}

/** Index, at least 1, of the first point that is not left of x (guides run to the right), by bisection. */
function firstPointAfter(guide: readonly Point[], x: number): number {
  let [low, high] = [1, guide.length];
  while (low < high) {
    const middle = (low + high) >> 1;
    if (guide[middle]![0] < x) low = middle + 1;
    else high = middle;
  }
  return low;
}

/** Height of a guide at x. */
export function heightAt(guide: readonly Point[], x: number): number {
  const next = Math.min(firstPointAfter(guide, x), guide.length - 1);
  const [x1, y1] = guide[next]!;
  const [x0, y0] = guide[Math.max(0, next - 1)]!;
  return x1 === x0 ? y1 : y0 + ((y1 - y0) * (x - x0)) / (x1 - x0);
}

/** Whether a guide runs through a box. */
export function crosses(guide: readonly Point[], box: Box): boolean {
  for (let i = firstPointAfter(guide, box.left); i < guide.length; i++) {
    const [x0, y0] = guide[i - 1]!;
    const [x1, y1] = guide[i]!;
    if (x0 > box.right) return false;
    const left = Math.max(x0, box.left);
    const right = Math.min(x1, box.right);
    if (left > right) continue;
    const at = (x: number): number => (x1 === x0 ? y0 : y0 + ((y1 - y0) * (x - x0)) / (x1 - x0));
    const low = Math.min(at(left), at(right));
    const high = Math.max(at(left), at(right));
    if (high > box.top && low < box.bottom) return true;
  }
  return false;
}

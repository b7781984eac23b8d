import type { CellStyle, Chip } from '../chip/Chip.js';
import { externalAtOutput } from '../chip/Chip.js';
import { InputError } from '../errors/InputError.js';

/** All lengths of the figure are in millimetres of print, the viewBox's unit. One point is 1/72 inch. */
export const POINT = 25.4 / 72;
export const SMALL_TEXT = 6.02 * POINT;
export const MARGIN = 0.8;
/** From a line's middle down to the baseline of a number that is centred on it. */
export const HALF_DIGIT = 0.36 * SMALL_TEXT;
/** Between the end of a guide and its label. */
export const LABEL_GAP = 0.6;
const ONE_COLUMN = 85;
const TWO_COLUMN = 178;
const NARROWEST = 30;
const WIDEST = 5000;

/**
 * Width of a mesh column below which a smaller page width is not taken by itself, and below which nothing is
 * drawn.
 */
const COMFORTABLE = { numbers: 9, plain: 3.4 } as const;
const LEAST_PLAIN_COLUMN = 0.4;
const WIDEST_COLUMN = 21;
/** Blocks smaller than this carry no hand. */
const LEAST_BLOCK_WITH_HAND = 1.1;
/** Baseline of a number above its block, from the block's edge; top of a number below its block likewise. */
const NUMBER_CLEARANCE = 0.45;
/** Length of bare guide before the first and behind the last element. */
const LEAD = 1;
/** Beside its number a port has a name only where the label has this much room. */
const LEAST_NAMED_LABEL = 9;
/** Names take this share of the width at either end, or more where columns are still as wide as this. */
const NAME_SHARE = 0.15;
const AMPLE_COLUMN = 12;
/** Between the numbers of neighbouring columns. */
const NUMBER_GAP = 0.15;

export type FigureWidth = 'one-column' | 'two-column' | number;

/** What of the options and the contents decides on the sizes. */
export interface LayoutWishes {
  readonly width?: FigureWidth | undefined;
  /** Undefined: numbers up to 12 ports, where they fit. */
  readonly numbers?: boolean | undefined;
  /**
   * Guarded widths of the widest phase, of the widest port number, and of the widest port number with its
   * name.
   */
  readonly numberWidth: number;
  readonly portNumberWidth: number;
  readonly portLabelWidth: number;
}

/** How many lines of numbers stand in a column above a cell's upper guide and below its lower one. */
export interface NumberLines {
  readonly above: number;
  readonly below: number;
}

/** The sizes of a mesh figure, in millimetres; x runs to the right, y downward. */
export interface MeshFigureLayout {
  readonly width: number;
  readonly numbers: boolean;
  readonly numberLines: NumberLines;
  /** Whether a cell's two numbers share a line when both are on the same side. */
  readonly numbersInOneLine: boolean;
  readonly portLabelWidth: number;
  readonly portNames: boolean;
  /** Left and right end of the guides. */
  readonly guideStart: number;
  readonly guideEnd: number;
  /** Left edge of the first column of cells, and width of a column. */
  readonly firstColumn: number;
  readonly columnWidth: number;
  /** Width of the column of port shifters, 0 without them, and its left edge. */
  readonly portColumnWidth: number;
  readonly portColumn: number;
  /** Distance between neighbouring guides. */
  readonly pitch: number;
  readonly block: number;
  readonly lineWidth: number;
  /** Whether blocks are large enough for a hand. */
  readonly hands: boolean;
  readonly cell: CellShape;
}

/**
 * A cell's parts along x, from the column's left edge, and the distance of its guides where they run close.
 */
export interface CellShape {
  /** Centres of the two shifters. */
  readonly external: number;
  readonly internal: number;
  /** Starts of the splitters (where the guides begin to bend), as the light meets them. */
  readonly splitters: readonly number[];
  /** Length of the straight arms. */
  readonly arm: number;
  readonly bend: number;
  readonly coupling: number;
  readonly spacing: number;
}

/**
 * The sizes for a chip.
 * @throws InputError `figure/width` for a width outside 30 to 5000 mm; `figure/too-narrow` when the width
 * that was asked
 *   for cannot hold the mesh, or not with the numbers that were asked for
 */
export function meshFigureLayout(chip: Chip, wishes: LayoutWishes): MeshFigureLayout {
  const wantsNumbers = wishes.numbers ?? chip.mesh.modes <= 12;
  if (wishes.width === undefined)
    return layoutOfWidth(chip, wishes, wantsNumbers, automaticWidth(chip, wishes, wantsNumbers));
  const width = askedWidth(wishes.width);
  const fits = (numbers: boolean): boolean => leastWidth(chip, wishes, numbers) <= width + 1e-9;
  const numbers = wantsNumbers && (wishes.numbers === true || fits(true));
  if (!fits(numbers)) {
    const least = Math.ceil(leastWidth(chip, wishes, numbers));
    const mend = numbers ? 'or leave the numbers out' : 'or draw a smaller mesh';
    throw new InputError(
      'figure/too-narrow',
      `a figure ${width} mm wide has no room for ${chip.mesh.columns} columns${numbers ? ' with numbers' : ''}`,
      `Make it at least ${least} mm wide, ${mend}.`,
    );
  }
  return layoutOfWidth(chip, wishes, numbers, width);
}

export function askedWidth(width: FigureWidth): number {
  if (width === 'one-column') return ONE_COLUMN;
  if (width === 'two-column') return TWO_COLUMN;
  if (!(width >= NARROWEST && width <= WIDEST)) {
    throw new InputError(
      'figure/width',
      `a figure cannot be ${width} mm wide`,
      `Give a width from ${NARROWEST} to ${WIDEST} mm, or one-column (${ONE_COLUMN} mm) or two-column (${TWO_COLUMN} mm).`,
    );
  }
  return width;
}

/**
 * One page column where the mesh is comfortable in it, else two, and more only where the numbers would not
 * fit.
 */
function automaticWidth(chip: Chip, wishes: LayoutWishes, numbers: boolean): number {
  const comfortable = numbers ? COMFORTABLE.numbers : COMFORTABLE.plain;
  const inOneColumn = columnWidthIn(chip, wishes, numbers, ONE_COLUMN);
  if (inOneColumn >= comfortable) return ONE_COLUMN;
  return Math.max(TWO_COLUMN, Math.ceil(leastWidth(chip, wishes, numbers)));
}

function leastColumn(wishes: LayoutWishes, numbers: boolean): number {
  return numbers ? wishes.numberWidth + NUMBER_GAP : LEAST_PLAIN_COLUMN;
}

/** Width of the figure in which the narrowest columns and the shortest labels just fit. */
function leastWidth(chip: Chip, wishes: LayoutWishes, numbers: boolean): number {
  const column = leastColumn(wishes, numbers);
  const portColumn = chip.portShifters ? portColumnWidth(wishes, numbers, column) : 0;
  return 2 * (MARGIN + LEAD + wishes.portNumberWidth) + portColumn + chip.mesh.columns * column;
}

function portColumnWidth(wishes: LayoutWishes, numbers: boolean, column: number): number {
  return numbers ? wishes.numberWidth + 0.6 : Math.min(column, 5);
}

/** Names give way, down to the bare numbers, before the columns do. */
function portLabelWidthIn(chip: Chip, wishes: LayoutWishes, numbers: boolean, width: number): number {
  const least = wishes.portNumberWidth;
  const spare = (width - leastWidth(chip, wishes, numbers)) / 2;
  const spareBesideAmple = spare - (chip.mesh.columns * (AMPLE_COLUMN - leastColumn(wishes, numbers))) / 2;
  const room = Math.min(least + spare, Math.max(NAME_SHARE * width, least + spareBesideAmple));
  if (wishes.portLabelWidth <= room) return wishes.portLabelWidth;
  return room >= LEAST_NAMED_LABEL ? room : least;
}

/** Width of a column of cells; the column of port shifters follows it where there are no numbers. */
function columnWidthIn(chip: Chip, wishes: LayoutWishes, numbers: boolean, width: number): number {
  const ends = 2 * (MARGIN + LEAD + portLabelWidthIn(chip, wishes, numbers, width));
  const columns = chip.mesh.columns;
  if (columns === 0) return WIDEST_COLUMN;
  const fixed = chip.portShifters && numbers ? portColumnWidth(wishes, numbers, 0) : 0;
  const shared = chip.portShifters && !numbers ? columns + 1 : columns;
  return Math.min(WIDEST_COLUMN, (width - ends - fixed) / shared);
}

function layoutOfWidth(chip: Chip, wishes: LayoutWishes, numbers: boolean, width: number): MeshFigureLayout {
  const columns = chip.mesh.columns;
  const columnWidth = columnWidthIn(chip, wishes, numbers, width);
  const portLabelWidth = portLabelWidthIn(chip, wishes, numbers, width);
  const portWidth = chip.portShifters ? portColumnWidth(wishes, numbers, columnWidth) : 0;
  const bareGuide = columns === 0 && portWidth === 0 ? 10 : 0;
  const length = 2 * LEAD + portWidth + columns * columnWidth + bareGuide;
  const guideStart = (width - length) / 2;
  const inputs = externalAtOutput(chip.style);
  const firstColumn = guideStart + LEAD + (inputs ? portWidth : 0);
  const numbersInOneLine = 2 * wishes.numberWidth + 1.2 <= columnWidth;
  const numberLines = numberLinesOf(chip.style, numbers, numbersInOneLine);
  const block = blockSize(columnWidth, numbers);
  const pitch = guidePitch(chip, columnWidth, numbers, numberLines, block);
  const lineWidth = Math.min(0.28, Math.max(0.09, 0.06 * columnWidth));
  return {
    width,
    numbers,
    numberLines,
    numbersInOneLine,
    portLabelWidth,
    portNames: portLabelWidth > wishes.portNumberWidth,
    guideStart,
    guideEnd: guideStart + length,
    firstColumn,
    columnWidth,
    portColumnWidth: portWidth,
    portColumn: inputs ? guideStart + LEAD : firstColumn + columns * columnWidth,
    pitch,
    block: numbers ? block : Math.min(block, 0.45 * pitch),
    lineWidth,
    hands: block >= LEAST_BLOCK_WITH_HAND,
    cell: cellShape(chip.style, columnWidth, block, lineWidth, numbersInOneLine && numbers),
  };
}

function blockSize(columnWidth: number, numbers: boolean): number {
  return numbers ? Math.min(1.9, Math.max(1.35, 0.13 * columnWidth)) : Math.min(1.4, 0.32 * columnWidth);
}

/** The numbers of a cell stand outside it: nothing else ever does in that column between two guides. */
function numberLinesOf(style: CellStyle, numbers: boolean, inOneLine: boolean): NumberLines {
  if (!numbers) return { above: 0, below: 0 };
  const externalAbove = isExternalAbove(style);
  const internalAbove = isInternalAbove(style);
  const lines = (external: boolean, internal: boolean): number =>
    external && internal ? (inOneLine ? 1 : 2) : external || internal ? 1 : 0;
  return { above: lines(externalAbove, internalAbove), below: lines(!externalAbove, !internalAbove) };
}

export function isExternalAbove(style: CellStyle): boolean {
  return style.external === 'upper-input' || style.external === 'upper-output';
}

/** A differential pair's one number takes the side that the external one leaves free. */
export function isInternalAbove(style: CellStyle): boolean {
  return style.internal === 'differential' ? !isExternalAbove(style) : style.internal === 'upper';
}

function guidePitch(chip: Chip, column: number, numbers: boolean, lines: NumberLines, block: number): number {
  if (!numbers) return Math.min(6, Math.max(1.5, 0.8 * column));
  const side = (count: number): number =>
    block / 2 + (count === 0 ? 0 : NUMBER_CLEARANCE + count * SMALL_TEXT);
  const betweenCells = side(lines.above) + side(lines.below);
  const portColumn = chip.portShifters ? side(1) + side(0) : 0;
  return Math.max(betweenCells + 0.3, portColumn + 0.3, Math.min(8.5, 0.52 * column));
}

/**
 * Baseline of the line-th number (from 0, counted away from the guide), from the guide; negative is above.
 */
export function numberBaseline(layout: MeshFigureLayout, above: boolean, line: number): number {
  const edge = layout.block / 2 + NUMBER_CLEARANCE;
  return above ? -(edge + line * SMALL_TEXT) : edge + 0.74 * SMALL_TEXT + line * SMALL_TEXT;
}

/**
 * Parts of a cell with the external shifter before the splitters of the arms, and a third splitter before
 * that; or the mirror image with it behind them.
 */
function cellShape(
  style: CellStyle,
  column: number,
  block: number,
  lineWidth: number,
  roomy: boolean,
): CellShape {
  const count = style.splitters;
  // Three splitters leave the external shifter no more room than it needs.
  const external = Math.max(block + 0.1 * column, (count === 3 ? 0.22 : roomy ? 0.34 : 0.3) * column);
  const rest = column - external - 0.04 * column;
  const arm = Math.max(0.24 * rest, Math.min(block * 1.15, 0.3 * rest));
  const coupling = 0.08 * rest;
  const bend = (rest - arm - count * coupling) / (2 * count);
  const splitter = 2 * bend + coupling;
  const outer = count === 3 ? splitter : 0;
  const first = outer + external;
  const second = first + splitter + arm;
  const starts = count === 3 ? [0, first, second] : [first, second];
  const mirrored = externalAtOutput(style);
  const placed = (x: number): number => (mirrored ? column - x : x);
  return {
    external: placed(outer + external / 2),
    internal: placed(first + splitter + arm / 2),
    splitters: mirrored ? starts.map((start) => column - start - splitter).reverse() : starts,
    arm,
    bend,
    coupling,
    spacing: Math.max(2.1 * lineWidth, Math.min(0.7, 0.1 * column)),
  };
}

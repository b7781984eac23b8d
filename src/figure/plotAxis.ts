import { ticks as makeTicks, tickStep } from 'd3-array';
import { precisionFixed } from 'd3-format';
import { scaleLinear, scaleLog } from 'd3-scale';
import { fixedText, isPlainSize, powerOfTenText, quantityText } from './numberText.js';

export interface Tick {
  readonly value: number;
  readonly text: string;
}

/** An axis: where values stand along it, and what is written. */
export interface Axis {
  readonly low: number;
  readonly high: number;
  /** Distance in millimetres from the axis' start; values beyond its ends stand at the ends. */
  readonly position: (value: number) => number;
  readonly ticks: readonly Tick[];
  /** Marks without a number. */
  readonly minor: readonly number[];
}

/** How much of the axis a label takes, its gap to the next included. */
export type LabelRoom = (text: string) => number;

const MOST_TICKS = 8;
/** Decades that still have their marks between. */
const MOST_DECADES_WITH_MINOR = 12;

/**
 * A linear axis with as many round ticks as fit.
 * @param length in millimetres
 * @param whole whether only whole numbers make sense on it
 */
export function linearAxis(low: number, high: number, length: number, room: LabelRoom, whole = false): Axis {
  const position = scaleLinear([low, high], [0, length]).clamp(true);
  return { low, high, position, ticks: roundTicks(low, high, position, room, whole), minor: [] };
}

/**
 * A logarithmic axis: decades are numbered where there are enough of them, else also their twos and fives,
 * and over less than that round numbers as on a linear axis.
 * @param low larger than 0
 */
export function logAxis(low: number, high: number, length: number, room: LabelRoom): Axis {
  const position = scaleLog([low, high], [0, length]).clamp(true);
  const within = (value: number): boolean => value >= low * (1 - 1e-9) && value <= high * (1 + 1e-9);
  const first = Math.floor(Math.log10(low));
  const last = Math.ceil(Math.log10(high));
  const multiples = (factors: readonly number[]): number[] =>
    Array.from({ length: last - first + 1 }, (_, i) => first + i)
      .flatMap((exponent) => factors.map((factor) => Number(`${factor}e${exponent}`)))
      .filter(within);
  const ticks = logTicks(multiples, position, room) ?? roundTicks(low, high, position, room);
  const minor =
    last - first <= MOST_DECADES_WITH_MINOR ? multiples([1, 2, 3, 4, 5, 6, 7, 8, 9]) : multiples([1]);
  const numbered = new Set(ticks.map(({ value }) => value));
  return { low, high, position, ticks, minor: minor.filter((value) => !numbered.has(value)) };
}

function logTicks(
  multiples: (factors: readonly number[]) => number[],
  position: Axis['position'],
  room: LabelRoom,
): Tick[] | null {
  const decades = multiples([1]);
  for (const values of decades.length < 3 ? [multiples([1, 2, 5]), multiples([1, 3]), decades] : [decades]) {
    const ticks = withLogTexts(values);
    if (ticks.length >= 2 && fit(ticks, position, room)) return ticks;
  }
  for (let stride = 2; stride < decades.length; stride++) {
    const ticks = withLogTexts(decades.filter((_, i) => i % stride === 0));
    if (ticks.length >= 2 && fit(ticks, position, room)) return ticks;
  }
  return null;
}

/** As many round numbers as fit, evenly apart in value. */
function roundTicks(
  low: number,
  high: number,
  position: Axis['position'],
  room: LabelRoom,
  whole = false,
): Tick[] {
  let ticks: Tick[] = [];
  for (let count = MOST_TICKS; count >= 1; count--) {
    const values = makeTicks(low, high, count).filter((value) => !whole || Number.isInteger(value));
    const step = tickStep(low, high, count);
    ticks = withLinearTexts(values, whole ? Math.max(1, step) : step);
    if (fit(ticks, position, room)) return ticks;
  }
  return ticks.slice(0, 1);
}

/** Whether neighbouring labels leave each other their room. */
function fit(ticks: readonly Tick[], position: Axis['position'], room: LabelRoom): boolean {
  return ticks.every((tick, i) => {
    const next = ticks[i + 1];
    if (next === undefined) return true;
    return position(next.value) - position(tick.value) >= (room(tick.text) + room(next.text)) / 2;
  });
}

/** All to the same number of decimals; sizes that are hard to read in multiples of one power of ten. */
function withLinearTexts(values: readonly number[], step: number): Tick[] {
  const largest = Math.max(0, ...values.map(Math.abs));
  if (largest === 0 || isPlainSize(largest)) {
    const decimals = precisionFixed(step);
    return values.map((value) => ({ value, text: fixedText(value, decimals) }));
  }
  const exponent = Math.floor(Math.log10(largest) + 1e-9);
  const decimals = precisionFixed(step / 10 ** exponent);
  return values.map((value) => {
    const mantissa = fixedText(value / 10 ** exponent, decimals);
    return { value, text: value === 0 ? '0' : `${mantissa}×${powerOfTenText(exponent)}` };
  });
}

function withLogTexts(values: readonly number[]): Tick[] {
  const plain = values.every(isPlainSize);
  return values.map((value) => ({ value, text: plain ? quantityText(value) : powerText(value) }));
}

function powerText(value: number): string {
  const [mantissa, exponent] = value.toExponential(2).split('e').map(Number) as [number, number];
  const power = powerOfTenText(exponent);
  if (mantissa === 1) return power;
  return exponent === 0 ? String(mantissa) : `${mantissa}×${power}`;
}

import type { Interval } from '../statistics/binomialInterval.js';

const SUPERSCRIPTS = '⁰¹²³⁴⁵⁶⁷⁸⁹';
/** Sizes that are written out; smaller and larger ones become a power of ten. */
const LEAST_PLAIN = 1e-4;
const LEAST_LONG = 1e6;

/** A number with so many decimals and a true minus sign. */
export function fixedText(value: number, decimals: number): string {
  const text = Math.abs(value).toFixed(decimals);
  return value < 0 && Number(text) !== 0 ? `−${text}` : text;
}

/** `10⁻⁹`; plainly `1` and `10` for the exponents 0 and 1. */
export function powerOfTenText(exponent: number): string {
  if (exponent === 0) return '1';
  if (exponent === 1) return '10';
  const digits = [...String(Math.abs(exponent))].map((digit) => SUPERSCRIPTS[Number(digit)]!).join('');
  return `10${exponent < 0 ? '⁻' : ''}${digits}`;
}

/**
 * A number to so many significant digits, without trailing zeros: `0.0125`, `1.25×10⁻⁷`; powers of ten only
 * beyond the sizes that are read at a glance. No unit prefixes: a fidelity or a ratio has none.
 */
export function quantityText(value: number, digits = 3): string {
  if (value === 0 || !Number.isFinite(value)) return value === 0 ? '0' : String(value);
  const [mantissa, exponent] = Math.abs(value)
    .toExponential(digits - 1)
    .split('e')
    .map(Number) as [number, number];
  const sign = value < 0 ? '−' : '';
  const size = mantissa * 10 ** exponent;
  if (isPlainSize(size)) {
    return sign + String(Number(Math.abs(value).toPrecision(digits)));
  }
  const power = powerOfTenText(exponent);
  return mantissa === 1 ? sign + power : `${sign}${mantissa}×${power}`;
}

/** Whether a size is read at a glance when its decimals are written out. */
export function isPlainSize(size: number): boolean {
  // 1 - 1e-9 of a power of ten counts as that power.
  return size >= LEAST_PLAIN * (1 - 1e-9) && size < LEAST_LONG;
}

/** A limit as somebody typed it: all its digits. */
export function limitText(value: number): string {
  return quantityText(value, 15);
}

/** A share in per cent, with as many decimals as it takes not to read 0 or 100 unless it is just that. */
export function shareText(count: number, total: number): string {
  const percent = (100 * count) / total;
  for (let decimals = 1; decimals < 12; decimals++) {
    const text = trimmed(percent.toFixed(decimals));
    if (count === 0 || count === total || (text !== '0' && text !== '100')) return `${text} %`;
  }
  return `${percent} %`;
}

/** A share in per cent with its interval, to a digit that the interval resolves: `97.3 % (97.0 to 97.6)`. */
export function shareWithInterval(share: number, { low, high }: Interval): string {
  const half = 50 * (high - low);
  const decimals = half > 0 ? Math.min(10, Math.max(0, Math.ceil(-Math.log10(half)))) : 2;
  const percent = (value: number): string => (100 * value).toFixed(decimals);
  return `${percent(share)} % (${percent(low)} to ${percent(high)})`;
}

function trimmed(decimal: string): string {
  return decimal.includes('.') ? decimal.replace(/\.?0+$/, '') : decimal;
}

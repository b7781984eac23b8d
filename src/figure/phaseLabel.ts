/**
 * A phase in radians as it is written beside its shifter: in multiples of pi, rounded to three decimals,
 * without trailing zeros; `0`, `π`, `0.392π`, with a true minus sign.
 */
export function phaseLabel(phase: number): string {
  const thousandths = Math.round((phase / Math.PI) * 1000);
  if (thousandths === 0) return '0';
  const size = Math.abs(thousandths) / 1000;
  return `${thousandths < 0 ? '−' : ''}${size === 1 ? '' : size}π`;
}

/**
 * Rows of text as aligned columns; a column is aligned to the right where every entry below the header looks
 * like a number.
 */
export function textTable(header: readonly string[], rows: readonly (readonly string[])[]): string {
  const widths = header.map((title, k) => Math.max(title.length, ...rows.map((row) => row[k]?.length ?? 0)));
  const numeric = header.map((_, k) => rows.every((row) => /^-?[\d.]*(e[-+]?\d+)?$/.test(row[k] ?? '')));
  const line = (cells: readonly string[]): string =>
    cells
      .map((cell, k) => (numeric[k] ? cell.padStart(widths[k]!) : cell.padEnd(widths[k]!)))
      .join('  ')
      .trimEnd();
  return [header, ...rows].map(line).join('\n');
}

/**
 * Advance widths of DejaVu Sans 2.37 in units of 1/2048 em, U+0020 to U+007E, read from the `hmtx` table of
 * the font as Debian's fonts-dejavu-core ships it; the widest sans-serif face in usual use.
 */
const ASCII = [
  651, 821, 942, 1716, 1303, 1946, 1597, 563, 799, 799, 1024, 1716, 651, 739, 651, 690, 1303, 1303, 1303,
  1303, 1303, 1303, 1303, 1303, 1303, 1303, 690, 690, 1716, 1716, 1716, 1087, 2048, 1401, 1405, 1430, 1577,
  1294, 1178, 1587, 1540, 604, 604, 1343, 1141, 1767, 1532, 1612, 1235, 1612, 1423, 1300, 1251, 1499, 1401,
  2025, 1403, 1251, 1403, 799, 690, 799, 1716, 1024, 1024, 1255, 1300, 1126, 1300, 1260, 721, 1300, 1298, 569,
  569, 1186, 569, 1995, 1298, 1253, 1300, 1300, 842, 1067, 803, 1298, 1212, 1675, 1212, 1212, 1075, 1303, 690,
  1303, 1716,
];
const OTHERS: Readonly<Record<string, number>> = { 'π': 1233, '−': 1716, '…': 2048, 'θ': 1253, 'φ': 1351 };

/**
 * Width of a line in DejaVu Sans, in the unit of `fontSize`; bold faces are at most 1.15 times as wide on a
 * line.
 */
export function dejaVuWidth(text: string, fontSize: number, bold = false): number {
  let units = 0;
  for (const character of text) units += ASCII[character.codePointAt(0)! - 32] ?? OTHERS[character] ?? 2048;
  return ((units * fontSize) / 2048) * (bold ? 1.15 : 1);
}

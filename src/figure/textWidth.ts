/**
 * How wide text may turn out. A figure does not know the font that a viewer will take, so widths are guarded:
 * they are those of DejaVu Sans, the widest of the usual sans-serif faces, rounded up. Helvetica and Arial
 * come out about 12 % narrower.
 */

/** Advance widths in em. Everything that is not listed has a default by kind, see `characterWidth`. */
const WIDTHS = new Map<string, number>();
const listWidth = (characters: string, width: number): void => {
  for (const character of characters) WIDTHS.set(character, width);
};
listWidth('0123456789', 0.64);
listWidth('π', 0.61);
listWidth('.', 0.32);
listWidth(" ijl|',:;", 0.34);
listWidth('frtI()[]-/\\!', 0.42);
listWidth('cksvxyzJ', 0.6);
listWidth('mw%MW@…—', 1.01);
listWidth('+=<>~^#−×±→', 0.85);

const BOLD = 1.15;
const ELLIPSIS = '…';
const graphemes = new Intl.Segmenter('en', { granularity: 'grapheme' });

/** Width of one character in em, an upper guard. */
function characterWidth(character: string): number {
  const listed = WIDTHS.get(character);
  if (listed !== undefined) return listed;
  if (/^[a-z]$/.test(character)) return 0.65;
  if (/^[A-Z]$/.test(character)) return 0.79;
  return character.codePointAt(0)! < 0x2e80 ? 0.88 : 1.1;
}

/**
 * An upper guard of the width of a line of text, in the unit of `fontSize`.
 * @param bold whether the line is set in bold
 */
export function guardedTextWidth(text: string, fontSize: number, bold = false): number {
  let width = 0;
  for (const character of text) width += characterWidth(character);
  return width * fontSize * (bold ? BOLD : 1);
}

/** The text itself when it fits in `width`, else as much of it as fits together with an ellipsis. */
export function cutText(text: string, width: number, fontSize: number): string {
  if (guardedTextWidth(text, fontSize) <= width) return text;
  let kept = '';
  for (const { segment } of graphemes.segment(text)) {
    if (guardedTextWidth(kept + segment + ELLIPSIS, fontSize) > width) break;
    kept += segment;
  }
  return kept.trimEnd() + ELLIPSIS;
}

/**
 * The text in lines that fit in `width`, broken at blanks, and inside a word only where the word alone is too
 * long.
 */
export function wrapText(text: string, width: number, fontSize: number, bold = false): string[] {
  const lines: string[] = [];
  let line = '';
  const fits = (candidate: string): boolean => guardedTextWidth(candidate, fontSize, bold) <= width;
  for (const word of text.split(' ')) {
    const longer = line === '' ? word : `${line} ${word}`;
    if (fits(longer)) {
      line = longer;
      continue;
    }
    if (line !== '') lines.push(line);
    line = '';
    for (const { segment } of graphemes.segment(word)) {
      if (line !== '' && !fits(line + segment)) {
        lines.push(line);
        line = '';
      }
      line += segment;
    }
  }
  if (line !== '') lines.push(line);
  return lines;
}

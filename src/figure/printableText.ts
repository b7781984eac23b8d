/**
 * Text as it may stand in an XML document: control characters, lone surrogates and noncharacters become a
 * blank, runs of blanks one blank. Markup is left alone here; the writer escapes it.
 */
export function printableText(text: string): string {
  return text
    .replace(/[\p{Cc}\p{Cs}\p{Zl}\p{Zp}\p{Bidi_Control}\p{Noncharacter_Code_Point}]+/gu, ' ')
    .replace(/\s+/g, ' ')
    .trim();
}

import type { CellStyle } from '../../src/chip/Chip.js';
import { EXTERNAL_GUIDES, INTERNAL_ARMS, SPLITTER_COUNTS, SPLITTER_FORMS } from '../../src/chip/Chip.js';

/** All 48 cell styles: 3 internal x 4 external x 2 splitter forms, with two splitters and with three. */
export const ALL_STYLES: readonly CellStyle[] = SPLITTER_COUNTS.flatMap((splitters) =>
  INTERNAL_ARMS.flatMap((internal) =>
    EXTERNAL_GUIDES.flatMap((external) =>
      SPLITTER_FORMS.map((splitterForm) => ({ internal, external, splitterForm, splitters })),
    ),
  ),
);

/** Those whose reach is that of the two splitters, whatever phases are carried. */
export const TWO_SPLITTER_STYLES = ALL_STYLES.filter(({ splitters }) => splitters === 2);
/** Those with a third splitter beyond the external phase. */
export const THREE_SPLITTER_STYLES = ALL_STYLES.filter(({ splitters }) => splitters === 3);

export function styleName({ internal, external, splitterForm, splitters }: CellStyle): string {
  return `${internal}, ${external}, ${splitterForm}, ${splitters} splitters`;
}

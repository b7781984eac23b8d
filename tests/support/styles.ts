import type { CellStyle } from '../../src/chip/Chip.js';
import { EXTERNAL_GUIDES, INTERNAL_ARMS, SPLITTER_FORMS } from '../../src/chip/Chip.js';

/** All 24 cell styles: 3 internal x 4 external x 2 splitter forms. */
export const ALL_STYLES: readonly CellStyle[] = INTERNAL_ARMS.flatMap((internal) =>
  EXTERNAL_GUIDES.flatMap((external) =>
    SPLITTER_FORMS.map((splitterForm) => ({ internal, external, splitterForm })),
  ),
);

export function styleName({ internal, external, splitterForm }: CellStyle): string {
  return `${internal}, ${external}, ${splitterForm}`;
}

import { HALF_DIGIT, LABEL_GAP, SMALL_TEXT } from './meshFigureLayout.js';
import type { MeshPen } from './MeshPen.js';
import { portLabel, portWithName } from './portLabel.js';
import { printableText } from './printableText.js';
import type { SvgPart } from './SvgPage.js';
import { cutText } from './textWidth.js';
import { thinnedNumbers } from './thinnedNumbers.js';

/** Port labels at both ends of the guides. */
export function drawPortLabels(page: SvgPart, { chip, layout, guideY }: MeshPen): void {
  const shown = thinnedNumbers(chip.mesh.modes, SMALL_TEXT / layout.pitch);
  for (const [side, x, anchor] of [
    ['input', layout.guideStart - LABEL_GAP, 'end'],
    ['output', layout.guideEnd + LABEL_GAP, 'start'],
  ] as const) {
    const group = page.add('g', { 'id': `${side}-ports`, 'text-anchor': anchor, 'font-size': SMALL_TEXT });
    for (const number of shown) {
      const full = layout.portNames ? printableText(portLabel(chip, number - 1)) : String(number);
      const text = group.add('g');
      text.addText('title', `${side} port ${portWithName(chip, number - 1)}`);
      text.addText('text', cutText(full, layout.portLabelWidth - LABEL_GAP + 1e-9, SMALL_TEXT), {
        x,
        y: guideY(number - 1) + HALF_DIGIT,
      });
    }
  }
}

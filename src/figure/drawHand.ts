import { markColour } from './phaseColour.js';
import type { SvgPart } from './SvgPage.js';
import { rounded } from './SvgPage.js';

/**
 * The mark that tells a phase without its hue: a hand from the middle of a square of the given size, pointing
 * along the phase counterclockwise from the right.
 */
export function drawHand(group: SvgPart, x: number, y: number, size: number, phase: number): void {
  const length = 0.4 * size;
  const tip = [x + length * Math.cos(phase), y - length * Math.sin(phase)] as const;
  group.add('path', {
    'class': 'hand',
    'd': `M${rounded(x)} ${rounded(y)}L${rounded(tip[0])} ${rounded(tip[1])}`,
    'stroke': markColour(phase),
    'stroke-width': 0.17 * size,
    'stroke-linecap': 'round',
    'fill': 'none',
  });
}

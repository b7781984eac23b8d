import { phaseColour } from './phaseColour.js';

/**
 * The colours of the curve figures are those of the mesh figure; dark and light stay apart in a grey print.
 */
export const PASS_COLOUR = phaseColour(1.3 * Math.PI);
export const FAIL_COLOUR = phaseColour(0.22 * Math.PI);
/** Behind a curve in PASS_COLOUR. */
export const BAND_COLOUR = phaseColour(1.85 * Math.PI);
export const INK = '#222222';
export const MUTED = '#666666';
export const GRID = '#e2e2e2';
export const HAIRLINE = 0.13;
export const CURVE_WIDTH = 0.35;

/**
 * The cyclic colour of a phase. In CIELAB, lightness falls evenly from 0 to pi and rises evenly back to 2 pi,
 * so that a grey print shows how far the phase is from 0; between, the colour is orange on the way down and
 * blue on the way up, two hues that every common kind of colour blindness tells apart. At 0 and pi the colour
 * is neutral.
 */

const LIGHTEST = 95;
const DARKEST = 20;
/** CIELAB a* and b* at pi/2 and at 3 pi/2. Larger values leave sRGB. */
const ORANGE = [24, 52] as const;
const BLUE = [-2, -44] as const;

/** White point D65 (2 degrees), and XYZ to linear sRGB: IEC 61966-2-1. */
const WHITE = [0.95047, 1, 1.08883] as const;
const LINEAR_FROM_XYZ = [
  [3.2404542, -1.5371385, -0.4985314],
  [-0.969266, 1.8760108, 0.041556],
  [0.0556434, -0.2040259, 1.0572252],
] as const;

/**
 * Red, green and blue of a phase in radians, from 0 to 255, not rounded and, being inside sRGB, not clipped.
 */
export function phaseRgb(phase: number): [red: number, green: number, blue: number] {
  const turn = turnOf(phase);
  const fromZero = distanceFromZero(turn);
  const hue = turn < 0.5 ? ORANGE : BLUE;
  const chroma = Math.sin(Math.PI * fromZero);
  return rgbFromLab(lightness(fromZero), hue[0] * chroma, hue[1] * chroma);
}

/** The colour of a phase in radians as `#rrggbb`; phases that differ by whole turns have the same colour. */
export function phaseColour(phase: number): string {
  return `#${phaseRgb(phase)
    .map((channel) => Math.round(channel).toString(16).padStart(2, '0'))
    .join('')}`;
}

/**
 * Black and white have the same contrast (WCAG 2) against a luminance of 0.179, which is a lightness of 49.4.
 */
const MIDDLE = 49.4;

/**
 * The colour, black or white, of a mark upon the phase's colour: the one that contrasts more, by at least 4.5
 * to 1.
 */
export function markColour(phase: number): string {
  return lightness(distanceFromZero(turnOf(phase))) < MIDDLE ? '#ffffff' : '#000000';
}

/** The phase in turns, in [0, 1). */
function turnOf(phase: number): number {
  return phase / (2 * Math.PI) - Math.floor(phase / (2 * Math.PI));
}

/** 0 at no turn, 1 at half a turn, evenly between. */
function distanceFromZero(turn: number): number {
  return 1 - Math.abs(2 * turn - 1);
}

function lightness(fromZero: number): number {
  return LIGHTEST - (LIGHTEST - DARKEST) * fromZero;
}

/** CIE 15: CIELAB to XYZ, then IEC 61966-2-1: XYZ to sRGB. */
function rgbFromLab(light: number, a: number, b: number): [number, number, number] {
  const fy = (light + 16) / 116;
  const decode = (f: number): number => (f > 6 / 29 ? f ** 3 : 3 * (6 / 29) ** 2 * (f - 4 / 29));
  const xyz = [fy + a / 500, fy, fy - b / 200].map((f, i) => WHITE[i]! * decode(f));
  const encode = (row: readonly number[]): number => {
    const linear = row[0]! * xyz[0]! + row[1]! * xyz[1]! + row[2]! * xyz[2]!;
    return 255 * (linear <= 0.0031308 ? 12.92 * linear : 1.055 * linear ** (1 / 2.4) - 0.055);
  };
  return [encode(LINEAR_FROM_XYZ[0]), encode(LINEAR_FROM_XYZ[1]), encode(LINEAR_FROM_XYZ[2])];
}

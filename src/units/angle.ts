const TURN = 2 * Math.PI;

/** Units in which a phase may be shown to a person. Files hold radians always. */
export type AngleUnit = 'rad' | 'pi' | 'deg';

/**
 * The angle's representative in [0, 2 pi). An angle within `tolerance` of a whole number of turns becomes
 * exactly 0: rounding noise just below zero is not a shifter driven to its far end.
 */
export function wrapTurn(angle: number, tolerance = 0): number {
  const wrapped = angle - TURN * Math.floor(angle / TURN);
  return wrapped <= tolerance || wrapped >= TURN - tolerance ? 0 : wrapped;
}

/** A phase in radians as a number in another unit. */
export function angleIn(unit: AngleUnit, angle: number): number {
  return unit === 'rad' ? angle : unit === 'pi' ? angle / Math.PI : (angle * 180) / Math.PI;
}

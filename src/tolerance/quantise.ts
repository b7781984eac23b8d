import type { Chip } from '../chip/Chip.js';
import type { Settings } from '../chip/Settings.js';
import { listShifters } from '../chip/shifters.js';

/**
 * Rounds phases to the 2^bits values that each shifter can be set to: from end to end of its range, both
 * included, or over a whole turn for one without a range, where both ends are the same. Made once for a chip:
 * it looks up all ranges.
 */
export function createQuantiser(chip: Chip, bits: number): (settings: Settings) => Settings {
  const low = { external: [] as number[], internal: [] as number[], port: [] as number[] };
  const step = { external: [] as number[], internal: [] as number[], port: [] as number[] };
  for (const shifter of listShifters(chip)) {
    const range = chip.shifterRanges.get(shifter.index) ?? chip.shifterRange;
    const kind = shifter.role === 'external' || shifter.role === 'internal' ? shifter.role : 'port';
    low[kind].push(range?.[0] ?? 0);
    step[kind].push(range ? (range[1] - range[0]) / (2 ** bits - 1) : (2 * Math.PI) / 2 ** bits);
  }
  const round = (kind: keyof typeof low, phases: Float64Array): Float64Array =>
    phases.map((phase, k) => {
      const size = step[kind][k]!;
      return size > 0 ? low[kind][k]! + size * Math.round((phase - low[kind][k]!) / size) : phase;
    });
  return ({ external, internal, port }) => ({
    external: round('external', external),
    internal: round('internal', internal),
    port: port && round('port', port),
  });
}

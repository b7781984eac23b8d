import type { Chip, PhaseRange } from '../chip/Chip.js';
import type { Settings } from '../chip/Settings.js';
import { listShifters } from '../chip/shifters.js';

/** What counts as the range of a shifter that has none. */
const WHOLE_TURN: PhaseRange = [0, 2 * Math.PI];

/** Rounds phases to 2^bits steps over each shifter's range. Made once for a chip: it looks up all ranges. */
export function createQuantiser(chip: Chip, bits: number): (settings: Settings) => Settings {
  const low = { external: [] as number[], internal: [] as number[], port: [] as number[] };
  const step = { external: [] as number[], internal: [] as number[], port: [] as number[] };
  for (const shifter of listShifters(chip)) {
    const [from, to] = chip.shifterRanges.get(shifter.index) ?? chip.shifterRange ?? WHOLE_TURN;
    const kind = shifter.role === 'external' || shifter.role === 'internal' ? shifter.role : 'port';
    low[kind].push(from);
    step[kind].push((to - from) / 2 ** bits);
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

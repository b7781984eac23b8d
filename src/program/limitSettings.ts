import type { Chip } from '../chip/Chip.js';
import type { Settings } from '../chip/Settings.js';
import { listShifters, phaseOf } from '../chip/shifters.js';
import { turnIntoRange } from '../chip/turns.js';
import type { OutOfRange } from './carryingSweep.js';

/** What the chip can set of the settings asked for. */
export interface LimitedSettings {
  readonly settings: Settings;
  readonly outOfRange: readonly OutOfRange[];
}

/**
 * The settings as the chip's shifters can take them: a phase outside its range is moved by turns that change
 * nothing, and where none helps stopped at the end that it ran over. Either is listed, since the table cannot
 * be set as it stands. Phases in range stay as they are, to the last bit.
 */
export function limitSettings(chip: Chip, settings: Settings): LimitedSettings {
  const limited: Settings = {
    external: settings.external.slice(),
    internal: settings.internal.slice(),
    port: settings.port?.slice() ?? null,
  };
  const outOfRange: OutOfRange[] = [];
  if (chip.shifterRange === null && chip.shifterRanges.size === 0) return { settings: limited, outOfRange };
  for (const shifter of listShifters(chip)) {
    const range = chip.shifterRanges.get(shifter.index) ?? chip.shifterRange;
    const wantedRad = phaseOf(settings, shifter);
    if (range === null || (wantedRad >= range[0] && wantedRad <= range[1])) continue;
    const differential = shifter.role === 'internal' && chip.style.internal === 'differential';
    const turned = turnIntoRange(wantedRad, range, differential ? 4 * Math.PI : 2 * Math.PI);
    const setRad = Number.isNaN(turned) ? Math.min(Math.max(wantedRad, range[0]), range[1]) : turned;
    outOfRange.push({ shifterIndex: shifter.index, wantedRad, setRad });
    if (shifter.role === 'external') limited.external[shifter.cellIndex!] = setRad;
    else if (shifter.role === 'internal') limited.internal[shifter.cellIndex!] = setRad;
    else limited.port![shifter.portIndex] = setRad;
  }
  return { settings: limited, outOfRange };
}

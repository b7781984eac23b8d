import type { Layout, Mirror } from '../mesh/Mesh.js';
import { createMesh } from '../mesh/Mesh.js';
import { splitterCount } from './cellSplitters.js';
import type { CellStyle, Chip } from './Chip.js';
import { NO_ERRORS } from './Chip.js';

/** External phase on the upper input, internal phase on the upper arm, two symmetric splitters. */
export const REFERENCE_STYLE: CellStyle = {
  internal: 'upper',
  external: 'upper-input',
  splitterForm: 'symmetric',
  splitters: 2,
};

/** What may be chosen of an ideal chip. */
export interface IdealChipOptions {
  readonly layout?: Layout;
  readonly mirror?: Mirror;
  readonly style?: CellStyle;
  readonly portShifters?: boolean;
}

/** A chip without flaws: 50:50 splitters, no loss, shifters of any range. */
export function idealChip(modes: number, options: IdealChipOptions = {}): Chip {
  const { layout = 'rectangular', mirror = 'none', style = REFERENCE_STYLE, portShifters = true } = options;
  const mesh = createMesh(layout, modes, mirror);
  const noLoss = (): Float64Array => new Float64Array(modes).fill(1);
  return {
    name: `ideal ${layout} ${modes}`,
    note: '',
    mesh,
    style,
    portShifters,
    couplingRatios: new Float64Array(splitterCount({ style, mesh })).fill(0.5),
    loss: { splitter: 1, shifter: 1, column: 1, input: noLoss(), output: noLoss() },
    cellLoss: null,
    shifterRange: null,
    shifterRanges: new Map(),
    shifterNames: new Map(),
    portNames: null,
    process: NO_ERRORS,
  };
}

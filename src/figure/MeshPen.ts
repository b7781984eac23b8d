import type { Chip } from '../chip/Chip.js';
import type { Settings } from '../chip/Settings.js';
import type { MeshFigureLayout } from './meshFigureLayout.js';

/** What every part of the mesh is drawn from. */
export interface MeshPen {
  readonly chip: Chip;
  readonly settings: Settings;
  readonly layout: MeshFigureLayout;
  /** Height of a guide by the index (from 0) of its port. */
  readonly guideY: (portIndex: number) => number;
}

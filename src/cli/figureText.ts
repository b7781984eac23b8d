import { basename } from 'node:path';
import type { Chip } from '../chip/Chip.js';
import type { Merit } from '../merit/merit.js';
import { matrixFileKind } from '../target/MatrixFileKind.js';
import { counted } from './messages.js';
import { shownMerit } from './reportParts.js';

/** A target's source as it stands in a figure: the folders of somebody's machine have no place there. */
export function shownSource(source: string): string {
  return matrixFileKind(source) === undefined ? source : basename(source);
}

/** The caption of a mesh figure: target, layout and fidelity. */
export function captionLines(chip: Chip, targetSource: string | null, merit: Merit | null): string[] {
  const { layout, mirror, modes, cells, columns } = chip.mesh;
  const mirrored = mirror === 'none' ? '' : `, mirrored (${mirror})`;
  const lines = [
    `${layout} mesh${mirrored}: ${counted(modes, 'port')}, ${counted(cells, 'cell')} in ${counted(columns, 'column')}`,
  ];
  if (targetSource !== null) lines.unshift(`target: ${shownSource(targetSource)}`);
  if (merit !== null) {
    lines.push(
      chip.portShifters
        ? `fidelity ${shownMerit(merit.fidelity)}`
        : `port-phase-free fidelity ${shownMerit(merit.portPhaseFreeFidelity)}`,
    );
  }
  return lines;
}

import type { Chip } from '../chip/Chip.js';
import type { Merit } from '../merit/merit.js';
import { shownMerit } from './reportParts.js';

/** The caption of a mesh figure: target, layout and fidelity. */
export function captionLines(chip: Chip, targetSource: string | null, merit: Merit | null): string[] {
  const { layout, mirror, modes, cells, columns } = chip.mesh;
  const mirrored = mirror === 'none' ? '' : `, mirrored (${mirror})`;
  const lines = [`${layout} mesh${mirrored}: ${modes} ports, ${cells} cells in ${columns} columns`];
  if (targetSource !== null) lines.unshift(`target: ${targetSource}`);
  if (merit !== null) {
    lines.push(
      chip.portShifters
        ? `fidelity ${shownMerit(merit.fidelity)}`
        : `port-phase-free fidelity ${shownMerit(merit.portPhaseFreeFidelity)}`,
    );
  }
  return lines;
}

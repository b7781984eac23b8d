import type { Command } from 'commander';
import { Option } from 'commander';
import type { MeshFigureOptions } from '../figure/drawMeshFigure.js';
import type { CellMargin } from '../program/cellMargins.js';

/** What the cells of a mesh figure may be shaded by; the shifters always show their phases. */
export const MESH_SHADES = ['phase', 'reach'] as const;
/** What the cells of a mesh figure are shaded by. */
export type MeshShade = (typeof MESH_SHADES)[number];

export function addShadeOption(command: Command): Command {
  return command.addOption(
    new Option(
      '--shade <what>',
      'figure: phase shows the shifters alone; reach shades cells by how near what is wanted is to what they can do',
    )
      .choices(MESH_SHADES)
      .default('phase'),
  );
}

/** The options of a mesh figure for a choice of shade. */
export function marginsForShade(
  shade: MeshShade,
  margins: readonly CellMargin[],
): Pick<MeshFigureOptions, 'cellMargins'> {
  return shade === 'reach' ? { cellMargins: margins.map(({ margin }) => margin) } : {};
}

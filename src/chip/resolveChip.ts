import { createMesh } from '../mesh/Mesh.js';
import { amplitudeFromLossDb } from '../units/decibel.js';
import { splitterCount } from './cellSplitters.js';
import type { CellStyle, Chip, ChipLoss, PhaseRange } from './Chip.js';
import { NO_ERRORS } from './Chip.js';
import { chipFault } from './chipFault.js';
import type { ChipFile } from './chipSchema.js';
import { REFERENCE_STYLE } from './idealChip.js';
import { shifterCount } from './shifters.js';

/**
 * The chip that a chip file describes, every default filled in and every number that refers to the mesh
 * checked.
 * @throws InputError for a cell, shifter or list that does not fit the mesh, naming the field
 */
export function resolveChip(file: ChipFile): Chip {
  const { modes, layout = 'rectangular', mirror = 'none', couplingRatio = 0.5 } = file;
  const mesh = createMesh(layout, modes, mirror);
  const style: CellStyle = { ...REFERENCE_STYLE, ...file.cellStyle };
  const { splitters } = style;
  const couplingRatios = new Float64Array(splitterCount({ style, mesh })).fill(couplingRatio);
  const seen = new Set<number>();
  file.measuredCells?.forEach(({ cell, couplingRatio: ratios, lossDb }, k) => {
    const field = `measuredCells[${k}].cell`;
    if (cell > mesh.cells) {
      throw chipFault(
        field,
        `there is no cell ${cell}`,
        `The cells of this mesh are numbered 1 to ${mesh.cells}.`,
      );
    }
    requireNew(seen, cell, field, 'cell');
    requireOnePerSplitter(ratios, splitters, `measuredCells[${k}].couplingRatio`);
    if (lossDb) requireOnePerSplitter(lossDb, splitters, `measuredCells[${k}].lossDb`);
    couplingRatios.set(ratios, splitters * (cell - 1));
  });
  if (file.portNames && file.portNames.length !== modes) {
    throw wrongLength('portNames', file.portNames.length, modes);
  }
  const range = file.shifterLimits?.rangeRad ?? null;
  if (range) requireRising(range, 'shifterLimits.rangeRad');
  const chip: Chip = {
    name: file.name ?? `${layout} ${modes}`,
    note: file.note ?? '',
    mesh,
    style,
    portShifters: file.portShifters ?? true,
    couplingRatios,
    loss: resolveLoss(file, modes),
    cellLoss: resolveCellLoss(file, mesh.cells, splitters),
    shifterRange: range,
    shifterRanges: new Map(),
    shifterNames: new Map(),
    portNames: file.portNames ?? null,
    process: { ...NO_ERRORS, ...file.process },
  };
  return { ...chip, ...resolveOverrides(file, shifterCount(chip)) };
}

function resolveLoss({ lossDb = {} }: ChipFile, modes: number): ChipLoss {
  const perPort = (value: number | number[] | undefined, field: string): Float64Array => {
    if (!Array.isArray(value)) return new Float64Array(modes).fill(amplitudeFromLossDb(value ?? 0));
    if (value.length !== modes) throw wrongLength(field, value.length, modes);
    return Float64Array.from(value, amplitudeFromLossDb);
  };
  return {
    splitter: amplitudeFromLossDb(lossDb.splitter ?? 0),
    shifter: amplitudeFromLossDb(lossDb.shifter ?? 0),
    column: amplitudeFromLossDb(lossDb.column ?? 0),
    input: perPort(lossDb.input, 'lossDb.input'),
    output: perPort(lossDb.output, 'lossDb.output'),
  };
}

function resolveCellLoss(
  { lossDb, measuredCells = [] }: ChipFile,
  cells: number,
  splitters: number,
): Float64Array | null {
  if (measuredCells.every((cell) => cell.lossDb === undefined)) return null;
  const cellLoss = new Float64Array(cells).fill(amplitudeFromLossDb(splitters * (lossDb?.splitter ?? 0)));
  for (const { cell, lossDb: own } of measuredCells) {
    if (own) cellLoss[cell - 1] = amplitudeFromLossDb(own.reduce((sum, each) => sum + each));
  }
  return cellLoss;
}

function resolveOverrides(
  file: ChipFile,
  shifters: number,
): { shifterRanges: Map<number, PhaseRange>; shifterNames: Map<number, string> } {
  const shifterRanges = new Map<number, PhaseRange>();
  const shifterNames = new Map<number, string>();
  const seen = new Set<number>();
  const names = new Set<string>();
  file.shifterOverrides?.forEach(({ shifter, name, rangeRad, stuckRad }, k) => {
    const field = `shifterOverrides[${k}]`;
    if (shifter > shifters) {
      throw chipFault(
        `${field}.shifter`,
        `there is no shifter ${shifter}`,
        `The shifters of this chip are numbered 1 to ${shifters}.`,
      );
    }
    requireNew(seen, shifter, `${field}.shifter`, 'shifter');
    if (rangeRad) {
      requireRising(rangeRad, `${field}.rangeRad`);
      shifterRanges.set(shifter - 1, rangeRad);
    }
    if (stuckRad !== undefined) {
      if (rangeRad) {
        throw chipFault(
          `${field}.stuckRad`,
          'a stuck shifter has no range',
          'Leave out rangeRad, or stuckRad for a shifter that works.',
        );
      }
      shifterRanges.set(shifter - 1, [stuckRad, stuckRad]);
    }
    if (name !== undefined) {
      if (names.has(name)) {
        throw chipFault(
          `${field}.name`,
          `two shifters are called ${name}`,
          'Give every shifter a name of its own.',
        );
      }
      names.add(name);
      shifterNames.set(shifter - 1, name);
    }
  });
  return { shifterRanges, shifterNames };
}

function requireNew(seen: Set<number>, number: number, field: string, noun: string): void {
  if (seen.has(number)) {
    throw chipFault(field, `${noun} ${number} is listed twice`, `Keep one entry for each ${noun}.`);
  }
  seen.add(number);
}

function requireOnePerSplitter(list: readonly number[], splitters: number, field: string): void {
  if (list.length !== splitters) {
    throw chipFault(
      field,
      `there are ${list.length} entries for a cell of ${splitters} splitters`,
      `Give one entry for each of its ${splitters} splitters, as the light meets them; ` +
        'how many a cell has is said by cellStyle.splitters.',
    );
  }
}

function requireRising([low, high]: PhaseRange, field: string): void {
  if (!(low <= high)) {
    throw chipFault(field, `the range runs from ${low} down to ${high}`, 'Put the smaller end first.');
  }
}

function wrongLength(field: string, found: number, modes: number): Error {
  return chipFault(
    field,
    `there are ${found} entries for ${modes} ports`,
    `Give one entry for each of the ${modes} ports, from the top.`,
  );
}

import type { ChipFile } from '../chip/chipSchema.js';
import type { ComplexMatrix } from '../matrix/ComplexMatrix.js';
import type { PhaseRow } from './PhaseTable.js';

/** The newest format of `phases.json` that this version reads and the one that it writes. */
export const TABLE_FORMAT = 1;

/** Where a phase table comes from. */
export interface TableProvenance {
  /** Version of the program. */
  readonly version: string;
  /** The target as it was programmed, after transposition, placing on ports and so on. */
  readonly target: { readonly source: string; readonly matrix: ComplexMatrix };
  readonly chip: ChipFile;
  /** The options of the command that change the result. */
  readonly options: Readonly<Record<string, unknown>>;
  /** Content hashes by name. */
  readonly hashes: Readonly<Record<string, string>>;
}

/** A phase table with its provenance as JSON, one line for each shifter and each row of the target. */
export function formatPhaseJson(rows: readonly PhaseRow[], provenance: TableProvenance): string {
  const { version, target, chip, options, hashes } = provenance;
  const { rows: modes, re, im } = target.matrix;
  const matrixRows = Array.from({ length: modes }, (_, i) =>
    JSON.stringify(Array.from({ length: modes }, (_, j) => [re[i * modes + j], im[i * modes + j]])),
  );
  const fields = [
    `"format": ${TABLE_FORMAT}`,
    `"version": ${JSON.stringify(version)}`,
    `"target": {\n    "source": ${JSON.stringify(target.source)},\n    "modes": ${modes},\n    "matrix": ${list(matrixRows, '    ')}\n  }`,
    `"chip": ${JSON.stringify(chip, null, 2).replaceAll('\n', '\n  ')}`,
    `"options": ${JSON.stringify(options)}`,
    `"hashes": ${JSON.stringify(hashes)}`,
    `"shifters": ${list(
      rows.map((row) => JSON.stringify(row)),
      '  ',
    )}`,
  ];
  return `{\n  ${fields.join(',\n  ')}\n}\n`;
}

function list(lines: readonly string[], indent: string): string {
  return lines.length === 0 ? '[]' : `[\n${indent}  ${lines.join(`,\n${indent}  `)}\n${indent}]`;
}

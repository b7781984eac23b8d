import { z } from 'zod';
import { LAYOUTS, MIRRORS } from '../mesh/Mesh.js';
import {
  ERROR_DISTRIBUTIONS,
  EXTERNAL_GUIDES,
  INTERNAL_ARMS,
  SPLITTER_COUNTS,
  SPLITTER_FORMS,
} from './Chip.js';

/** The newest chip-file format that this version reads and the one that it writes. */
export const CHIP_FORMAT = 1;

/** Ports that a chip may have; a mesh of 1024 ports has over a million shifters. */
const MAX_CHIP_MODES = 1024;

const ratio = z
  .number()
  .min(0)
  .max(1)
  .describe('Power coupling ratio: the share of the power that changes guide.');
const ratiosOfCell = z
  .array(ratio)
  .min(2)
  .max(3)
  .describe("The cell's splitters as the light meets them: as many as cellStyle.splitters says.");
const decibels = z.number().min(0).max(1000).describe('Loss in dB, 0 or more.');
const decibelsPerPort = z
  .union([decibels, z.array(decibels)])
  .describe('Loss in dB: one number for all ports, or one for each port from the top.');
const spread = z.number().min(0).max(10);
const angle = z.number().min(-1e4).max(1e4);
const range = z
  .tuple([angle, angle])
  .describe('Least and greatest phase in radians that can be set, both ends included.');
const name = z.string().min(1).max(200);

/**
 * The chip file. Only `modes` is required; unknown keys are refused.
 */
export const chipFileSchema = z
  .strictObject({
    $schema: z.string().exactOptional().describe('Where editors find this schema.'),
    format: z.literal(CHIP_FORMAT).exactOptional().describe('Version of the file format.'),
    name: name.exactOptional().describe('Name of the chip.'),
    note: z.string().max(10_000).exactOptional().describe('Anything that a reader should know.'),
    modes: z.int().min(1).max(MAX_CHIP_MODES).describe('Number of ports on either side.'),
    layout: z
      .enum(LAYOUTS)
      .exactOptional()
      .describe('rectangular (Clements et al. 2016, the default) or triangular (Reck et al. 1994).'),
    mirror: z
      .enum(MIRRORS)
      .exactOptional()
      .describe(
        'ports: port p at the place of port N+1-p. columns: the columns in reverse order. Default none.',
      ),
    portShifters: z
      .boolean()
      .exactOptional()
      .describe('Whether the N phases at the outputs (or inputs) are there; default true.'),
    cellStyle: z
      .strictObject({
        internal: z
          .enum(INTERNAL_ARMS)
          .exactOptional()
          .describe(
            'Arm of the internal phase; differential is +theta/2 above, -theta/2 below. Default upper.',
          ),
        external: z
          .enum(EXTERNAL_GUIDES)
          .exactOptional()
          .describe('Guide of the external phase. Default upper-input.'),
        splitterForm: z
          .enum(SPLITTER_FORMS)
          .exactOptional()
          .describe(
            '[[cos a, i sin a], [i sin a, cos a]] (symmetric, default) or [[cos a, sin a], [sin a, -cos a]].',
          ),
        splitters: z
          .literal(SPLITTER_COUNTS)
          .exactOptional()
          .describe(
            '3: one more, before an external phase at the input or behind one at the output. Default 2.',
          ),
      })
      .exactOptional()
      .describe('How every cell is built, as it stands on the chip.'),
    couplingRatio: ratio.exactOptional().describe('Nominal ratio of every splitter; default 0.5.'),
    measuredCells: z
      .array(
        z.strictObject({
          cell: z.int().min(1).describe('Number of the cell.'),
          couplingRatio: ratiosOfCell,
          lossDb: z
            .array(decibels)
            .min(2)
            .max(3)
            .exactOptional()
            .describe('Losses of its splitters in dB, as the light meets them, instead of lossDb.splitter.'),
        }),
      )
      .exactOptional()
      .describe('Measured ratios; cells that are not listed have the nominal one.'),
    lossDb: z
      .strictObject({
        splitter: decibels.exactOptional().describe('On both ports at each splitter passed.'),
        shifter: decibels.exactOptional().describe('On the one guide of each phase shifter.'),
        column: decibels.exactOptional().describe('On all ports at each column.'),
        input: decibelsPerPort.exactOptional().describe('Coupling (facet) loss at the inputs.'),
        output: decibelsPerPort.exactOptional().describe('Coupling (facet) loss at the outputs.'),
      })
      .exactOptional()
      .describe('Losses in dB; what is not given is 0.'),
    shifterLimits: z
      .strictObject({ rangeRad: range })
      .exactOptional()
      .describe('Limits of every shifter; without them any phase can be set.'),
    shifterOverrides: z
      .array(
        z.strictObject({
          shifter: z.int().min(1).describe('Number of the shifter, as in the phase table.'),
          name: name.exactOptional().describe('Name of the shifter, such as its pad.'),
          rangeRad: range.exactOptional(),
          stuckRad: angle
            .exactOptional()
            .describe('The phase in radians at which a dead shifter stays; instead of rangeRad.'),
        }),
      )
      .exactOptional()
      .describe('Shifters with a name or limits of their own, or stuck at a phase.'),
    portNames: z.array(name).exactOptional().describe('Names of the ports from the top.'),
    process: z
      .strictObject({
        sigma: spread.exactOptional().describe('Standard deviation of the coupling ratio of every splitter.'),
        sigmaAngle: spread
          .exactOptional()
          .describe('The same for the angle a of a ratio sin^2 a, in radians.'),
        bias: z.number().min(-1).max(1).exactOptional().describe('Shift of all coupling ratios.'),
        biasSigma: spread.exactOptional().describe('Standard deviation of a shift that a die has in common.'),
        pairCorrelation: z
          .number()
          .min(-1)
          .max(1)
          .exactOptional()
          .describe(
            'Correlation of the local errors of any two splitters of a cell; for three at least -1/2.',
          ),
        correlationLength: z
          .number()
          .min(0)
          .max(1e6)
          .exactOptional()
          .describe(
            'L in cells: local errors are correlated by exp(-(columns apart + ports apart / 2) / L); 0 for none.',
          ),
        phaseSigma: spread.exactOptional().describe('Standard deviation of every phase, in radians.'),
        bits: z
          .int()
          .min(0)
          .max(32)
          .exactOptional()
          .describe('Resolution of the phases over their range; 0 for continuous.'),
        lossSigmaDb: z
          .number()
          .min(0)
          .max(100)
          .exactOptional()
          .describe('Standard deviation of each splitter loss in dB; losses stay at or above 0.'),
        distribution: z.enum(ERROR_DISTRIBUTIONS).exactOptional().describe('Of all errors; default normal.'),
      })
      .exactOptional()
      .describe(
        'How chips of this process differ from what is nominal or measured; for yield and tolerance.',
      ),
  })
  .describe('A programmable photonic chip: a mesh of Mach-Zehnder interferometers.');

/** A chip file that has passed the schema. */
export type ChipFile = z.infer<typeof chipFileSchema>;

/** The schema as JSON Schema (draft 2020-12), for editors. */
export function chipJsonSchema(): Record<string, unknown> {
  return { title: 'phasewright chip file', ...z.toJSONSchema(chipFileSchema) };
}

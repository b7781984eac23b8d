import { readdirSync, readFileSync } from 'node:fs';
import { Ajv2020 } from 'ajv/dist/2020.js';
import { describe, expect, it } from 'vitest';
import { chipJsonSchema } from '../../src/chip/chipSchema.js';
import { chipFromDocument, readChip } from '../../src/chip/readChip.js';
import {
  listShifters,
  shifterCount,
  shifterIndexOfPort,
  shifterIndicesOfCell,
} from '../../src/chip/shifters.js';
import { idealChip } from '../../src/chip/idealChip.js';
import { InputError } from '../../src/errors/InputError.js';
import { ALL_STYLES } from '../support/styles.js';

const MESHES = new URL('../../meshes/', import.meta.url);
const encode = (document: unknown): Uint8Array => new TextEncoder().encode(JSON.stringify(document));

function fault(document: unknown): InputError {
  try {
    readChip(encode(document));
  } catch (error) {
    if (error instanceof InputError) return error;
    throw error;
  }
  throw new Error(`accepted: ${JSON.stringify(document)}`);
}

describe('defaults', () => {
  it('needs the number of ports only', () => {
    const { chip } = readChip(encode({ modes: 5 }));
    expect(chip).toEqual({ ...idealChip(5), name: 'rectangular 5' });
  });

  it('turns dB into amplitude factors, 10^(-dB/20)', () => {
    const { chip } = readChip(
      encode({ modes: 2, lossDb: { splitter: 20, shifter: 6, column: 0, input: 3, output: [0, 40] } }),
    );
    expect(chip.loss.splitter).toBeCloseTo(0.1, 15);
    expect(chip.loss.shifter).toBeCloseTo(0.501187233627272, 14);
    expect(chip.loss.column).toBe(1);
    expect(Array.from(chip.loss.input, (a) => a ** 2)).toEqual([
      expect.closeTo(0.501187233627272, 14),
      expect.closeTo(0.501187233627272, 14),
    ]);
    expect(Array.from(chip.loss.output)).toEqual([1, expect.closeTo(0.01, 15)]);
  });

  it('puts measured ratios in the order of the light, nominal ones elsewhere', () => {
    const { chip } = readChip(
      encode({ modes: 3, couplingRatio: 0.49, measuredCells: [{ cell: 2, couplingRatio: [0.4, 0.6] }] }),
    );
    expect(Array.from(chip.couplingRatios)).toEqual([0.49, 0.49, 0.4, 0.6, 0.49, 0.49]);
  });

  it('takes three ratios and losses where cells have three splitters', () => {
    const { chip } = readChip(
      encode({
        modes: 3,
        cellStyle: { splitters: 3 },
        couplingRatio: 0.49,
        lossDb: { splitter: 1 },
        measuredCells: [{ cell: 2, couplingRatio: [0.4, 0.5, 0.6], lossDb: [1, 2, 3.5] }],
      }),
    );
    const nominal = [0.49, 0.49, 0.49];
    expect(Array.from(chip.couplingRatios)).toEqual([...nominal, 0.4, 0.5, 0.6, ...nominal]);
    // 3 dB of three splitters, 6.5 dB of those measured.
    const powers = Array.from(chip.cellLoss!, (amplitude) => -20 * Math.log10(amplitude));
    [3, 6.5, 3].forEach((lossDb, cell) => expect(powers[cell]).toBeCloseTo(lossDb, 13));
  });

  it('accepts a byte order mark', () => {
    const text = `\ufeff${JSON.stringify({ modes: 2 })}`;
    expect(readChip(new TextEncoder().encode(text)).chip.mesh.modes).toBe(2);
  });
});

describe('faults name the field and the way to mend it', () => {
  it.each([
    [{}, 'modes: is missing', 'whole number|number'],
    [{ modes: 0 }, 'modes: 0 is not', '1 or more'],
    [{ modes: 2.5 }, 'modes: 2.5 is not a whole number', 'whole number'],
    [{ modes: 4096 }, 'modes: 4096', 'at most 1024'],
    [{ modes: 4, moeds: 1 }, 'moeds: unknown key', 'modes'],
    [{ modes: 4, layout: 'triangle' }, 'layout: "triangle"', 'triangular'],
    [{ modes: 4, cellStyle: { internl: 'upper' } }, 'cellStyle.internl: unknown key', 'internal'],
    [{ modes: 4, cellStyle: { external: 'upper' } }, 'cellStyle.external: "upper"', 'upper-input'],
    [{ modes: 4, couplingRatio: 1.2 }, 'couplingRatio: 1.2', 'at most 1'],
    [
      { modes: 4, measuredCells: [{ cell: 7, couplingRatio: [0.5, 0.5] }] },
      'measuredCells[0].cell: there is no cell 7',
      '1 to 6',
    ],
    [
      { modes: 4, measuredCells: [1, 1].map((cell) => ({ cell, couplingRatio: [0.5, 0.5] })) },
      'measuredCells[1].cell: cell 1 is listed twice',
      'one entry',
    ],
    [
      { modes: 4, measuredCells: [{ cell: 1, couplingRatio: [0.5, -0.1] }] },
      'measuredCells[0].couplingRatio[1]: -0.1',
      '0 or more',
    ],
    [
      { modes: 4, measuredCells: [{ cell: 1, couplingRatios: [0.5, 0.5] }] },
      'measuredCells[0].couplingRatios: unknown key',
      'Did you mean couplingRatio?',
    ],
    [{ modes: 4, cellStyle: { splitters: 4 } }, 'cellStyle.splitters: 4 is not', '3'],
    [{ modes: 4, cellStyle: { splitters: '3' } }, 'cellStyle.splitters: "3" is not', '3'],
    [
      { modes: 4, cellStyle: { splitters: 3 }, measuredCells: [{ cell: 2, couplingRatio: [0.5, 0.4] }] },
      'measuredCells[0].couplingRatio: there are 2 entries for a cell of 3 splitters',
      'one entry for each of its 3 splitters',
    ],
    [
      { modes: 4, measuredCells: [{ cell: 2, couplingRatio: [0.5, 0.4, 0.5] }] },
      'measuredCells[0].couplingRatio: there are 3 entries for a cell of 2 splitters',
      'cellStyle.splitters',
    ],
    [
      { modes: 4, measuredCells: [{ cell: 2, couplingRatio: [0.5, 0.4], lossDb: [1, 1, 1] }] },
      'measuredCells[0].lossDb: there are 3 entries for a cell of 2 splitters',
      'one entry for each of its 2 splitters',
    ],
    [
      {
        modes: 4,
        cellStyle: { splitters: 3 },
        measuredCells: [{ cell: 2, couplingRatio: [0.5, 0.4, 0.5], lossDb: [1, 1] }],
      },
      'measuredCells[0].lossDb: there are 2 entries for a cell of 3 splitters',
      'one entry',
    ],
    [
      { modes: 4, measuredCells: [{ cell: 2, couplingRatio: [0.5, 0.4, 0.5, 0.5] }] },
      'measuredCells[0].couplingRatio:',
      '3',
    ],
    [
      { modes: 4, measuredCells: [{ cell: 2, couplingRatio: [0.5] }] },
      'measuredCells[0].couplingRatio:',
      '2',
    ],
    [{ modes: 4, lossDb: { splitter: -1 } }, 'lossDb.splitter: -1', '0 or more'],
    [
      { modes: 4, lossDb: { output: [1, 2, 3] } },
      'lossDb.output: there are 3 entries for 4 ports',
      '4 ports',
    ],
    [{ modes: 4, lossDb: { input: [1, 'x', 0, 0] } }, 'lossDb.input[1]: "x"', 'number'],
    [{ modes: 4, portNames: ['a'] }, 'portNames: there are 1 entries for 4 ports', '4 ports'],
    [{ modes: 4, shifterLimits: { rangeRad: [3, 1] } }, 'shifterLimits.rangeRad', 'smaller end first'],
    [
      { modes: 4, shifterOverrides: [{ shifter: 17 }] },
      'shifterOverrides[0].shifter: there is no shifter 17',
      '1 to 16',
    ],
    [{ modes: 4, portShifters: false, shifterOverrides: [{ shifter: 13 }] }, 'no shifter 13', '1 to 12'],
    [
      { modes: 4, shifterOverrides: [{ shifter: 2 }, { shifter: 2 }] },
      'shifter 2 is listed twice',
      'one entry',
    ],
    [
      { modes: 4, shifterOverrides: [1, 2].map((shifter) => ({ shifter, name: 'W1' })) },
      'two shifters are called W1',
      'name of its own',
    ],
    [{ modes: 4, format: 2 }, 'format: this chip file has format 2', 'newer version'],
    [[4], 'one JSON object', '"modes": 4'],
  ])('%j', (document, message, remedy) => {
    const error = fault(document);
    expect(error.message).toContain(message);
    expect(error.remedy).toMatch(new RegExp(remedy.replace(/[[\]"?.]/g, '\\$&')));
  });

  it('refuses numbers that JSON cannot hold and prototype tricks', () => {
    expect(() => chipFromDocument({ modes: NaN })).toThrow(InputError);
    expect(() => chipFromDocument({ modes: 4, couplingRatio: NaN })).toThrow(InputError);
    expect(() =>
      chipFromDocument({ modes: 4, measuredCells: [{ cell: 1, couplingRatio: [NaN, 0.5] }] }),
    ).toThrow(InputError);
    const tricky = new TextEncoder().encode('{"modes": 4, "__proto__": {"layout": "triangular"}}');
    expect(() => readChip(tricky)).toThrow(InputError);
  });
});

describe('JSON Schema', () => {
  const stored = JSON.parse(readFileSync(new URL('chip.schema.json', MESHES), 'utf8')) as object;

  it('is the one in meshes/ (npm run schema writes it anew)', () => {
    expect(stored).toEqual(JSON.parse(JSON.stringify(chipJsonSchema())));
  });

  it('takes what the reader takes and refuses what it refuses, ajv being the judge', () => {
    const validate = new Ajv2020({ strict: true }).compile(stored);
    const examples = readdirSync(MESHES).filter((name) => name.endsWith('.chip.json'));
    expect(examples.length).toBeGreaterThanOrEqual(3);
    for (const name of examples) {
      const bytes = readFileSync(new URL(name, MESHES));
      expect(validate(JSON.parse(bytes.toString('utf8'))), name).toBe(true);
      expect(() => readChip(bytes), name).not.toThrow();
    }
    for (const bad of [
      {},
      { modes: 0 },
      { modes: 4, extra: 1 },
      { modes: 4, layout: 'square' },
      { modes: 4, lossDb: { column: -1 } },
      { modes: 4, measuredCells: [{ cell: 1, couplingRatio: [0.5] }] },
      { modes: 4, measuredCells: [{ cell: 1, couplingRatio: [0.5, 2] }] },
      { modes: 4, shifterLimits: {} },
    ]) {
      expect(validate(bad), JSON.stringify(bad)).toBe(false);
      expect(() => readChip(encode(bad)), JSON.stringify(bad)).toThrow(InputError);
    }
  });
});

describe('shifter numbers', () => {
  it('run from input phases over the cells, as the light meets them, to output phases, in every style', () => {
    for (const style of ALL_STYLES) {
      for (const portShifters of [true, false]) {
        const chip = idealChip(4, { style, portShifters });
        const shifters = listShifters(chip);
        expect(shifters).toHaveLength(shifterCount(chip));
        expect(shifterCount(chip)).toBe(portShifters ? 16 : 12);
        const atOutput = style.external.endsWith('output');
        const roles = shifters.map(({ role }) => role);
        const perCell = atOutput ? ['internal', 'external'] : ['external', 'internal'];
        const cells = Array.from({ length: 6 }, () => perCell).flat();
        const ports = portShifters ? Array.from({ length: 4 }, () => (atOutput ? 'input' : 'output')) : [];
        expect(roles).toEqual(atOutput ? [...ports, ...cells] : [...cells, ...ports]);
        for (const shifter of shifters) {
          const expected =
            shifter.cellIndex === null
              ? shifterIndexOfPort(chip, shifter.portIndex)
              : shifterIndicesOfCell(chip, shifter.cellIndex)[shifter.role as 'external' | 'internal'];
          expect(shifter.index).toBe(expected);
        }
      }
    }
  });
});

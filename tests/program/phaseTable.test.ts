import { describe, expect, it } from 'vitest';
import { chipFromDocument } from '../../src/chip/readChip.js';
import { InputError } from '../../src/errors/InputError.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import { formatPhaseJson } from '../../src/program/formatPhaseJson.js';
import { limitSettings } from '../../src/program/limitSettings.js';
import { formatPhaseCsv, phaseRows } from '../../src/program/PhaseTable.js';
import { programChip } from '../../src/program/programChip.js';
import { readPhaseTable } from '../../src/program/readPhaseTable.js';
import { settingsFromRows } from '../../src/program/settingsFromRows.js';
import { simulate } from '../../src/simulate/simulate.js';
import { maxDifference, permutation } from '../support/matrices.js';
import { ALL_STYLES, styleName } from '../support/styles.js';

const encode = (text: string): Uint8Array => new TextEncoder().encode(text);

function table(document: object, seed = 3): { csv: string; json: string } {
  const { file, chip } = chipFromDocument(document);
  const matrix = haarUnitary(chip.mesh.modes, seed);
  const rows = phaseRows(chip, programChip(chip, matrix).program.settings);
  const provenance = {
    version: '0',
    target: { source: 'a "test"', matrix },
    chip: file,
    options: {},
    hashes: {},
  };
  return { csv: formatPhaseCsv(rows), json: formatPhaseJson(rows, provenance) };
}

describe('phases.csv', () => {
  it('has the header, one row per shifter in the order of the light, and full precision', () => {
    const { chip } = chipFromDocument({
      modes: 2,
      shifterOverrides: [{ shifter: 2, name: 'W2, "east"' }],
    });
    const rows = phaseRows(chip, programChip(chip, permutation([1, 0])).program.settings);
    // The swap: theta = phi = 0, output phases 1.5 pi (check-values section 5).
    expect(formatPhaseCsv(rows)).toBe(
      'shifter,cell,role,column,port,phase_rad,name\n' +
        '1,1,external,1,1,0,\n' +
        '2,1,internal,1,1,0,"W2, ""east"""\n' +
        '3,,output,,1,4.71238898038469,\n' +
        '4,,output,,2,4.71238898038469,\n',
    );
  });

  it('puts input phases first and the external phase last in a cell that has it at the output', () => {
    const { chip } = chipFromDocument({
      modes: 2,
      cellStyle: { external: 'lower-output', internal: 'lower' },
    });
    const rows = phaseRows(chip, programChip(chip, permutation([1, 0])).program.settings);
    expect(rows.map(({ role, port }) => [role, port])).toEqual([
      ['input', 1],
      ['input', 2],
      ['internal', 2],
      ['external', 2],
    ]);
  });
});

describe('reading back', () => {
  it.each(ALL_STYLES.map((style) => [styleName(style), style] as const))('%s', (_name, cellStyle) => {
    for (const portShifters of [true, false]) {
      const document = { modes: 4, cellStyle, portShifters, layout: 'triangular' };
      const { csv, json } = table(document);
      const { chip } = chipFromDocument(document);
      const exact = programChip(chip, haarUnitary(4, 3)).program.settings;
      const fromCsv = readPhaseTable(encode(csv));
      expect(fromCsv.origin).toBeNull();
      expect(settingsFromRows(chip, fromCsv.rows)).toEqual(exact);
      const fromJson = readPhaseTable(encode(json));
      expect(fromJson.rows).toEqual(fromCsv.rows);
      expect(fromJson.origin!.target).toEqual(haarUnitary(4, 3));
      expect(fromJson.origin!.targetSource).toBe('a "test"');
      expect(fromJson.origin!.chip.chip).toEqual(chip);
    }
  });

  it('takes what spreadsheets make of a CSV: byte order mark, CRLF, semicolons, quotes, another order', () => {
    const { csv } = table({ modes: 3 });
    const { rows } = readPhaseTable(encode(csv));
    expect(readPhaseTable(encode(`\ufeff${csv.replaceAll('\n', '\r\n')}`)).rows).toEqual(rows);
    expect(readPhaseTable(encode(csv.replaceAll(',', ';'))).rows).toEqual(rows);
    expect(readPhaseTable(encode(csv.replaceAll(/[^,\n]+/g, '"$&"'))).rows).toEqual(rows);
    // Columns in another order, and decimal commas where fields are parted by semicolons.
    const turned = csv.replace(/^.*$/gm, (line) => line.split(',').reverse().join(','));
    expect(readPhaseTable(encode(turned)).rows).toEqual(rows);
    const european = csv.replaceAll(',', ';').replaceAll('.', ',');
    expect(readPhaseTable(encode(european)).rows).toEqual(rows);
    const [header, ...lines] = csv.trimEnd().split('\n');
    const { chip } = chipFromDocument({ modes: 3 });
    const shuffled = readPhaseTable(encode([header, ...lines.reverse()].join('\n')));
    expect(settingsFromRows(chip, shuffled.rows)).toEqual(settingsFromRows(chip, rows));
  });
});

describe('faults', () => {
  const { csv, json } = table({ modes: 3 });
  const { chip } = chipFromDocument({ modes: 3 });
  const fault = (text: string): InputError => {
    try {
      settingsFromRows(chip, readPhaseTable(encode(text)).rows);
    } catch (error) {
      if (error instanceof InputError) return error;
      throw error;
    }
    throw new Error('accepted');
  };
  const lines = csv.trimEnd().split('\n');
  const change = (k: number, line: string): string =>
    lines.map((old, at) => (at === k ? line : old)).join('\n');

  it.each([
    ['', /empty/],
    ['shifter,phase\n1,0\n', /not a phase table/],
    [lines.slice(0, -1).join('\n'), /no row for shifter 9/],
    [lines.slice(0, 3).join('\n'), /7 of 9 shifters have no row, the first is shifter 3/],
    [[...lines, lines[3]!].join('\n'), /row 10: shifter 3 is listed twice/],
    [[...lines, '10,,output,,4,0,'].join('\n'), /row 10: there is no shifter 10/],
    [change(2, '2,1,external,1,1,0,'), /row 2: shifter 2 has role external, but internal/],
    [change(2, '2,2,internal,1,1,0,'), /row 2: shifter 2 has cell 2, but 1/],
    [change(2, '2,1,internal,1,2,0,'), /port 2, but 1/],
    [change(2, '2,1,internal,1,1,nan,'), /row 2: the phase is not a number/],
    [change(2, '2,1,internal,1,1,Infinity,'), /row 2: the phase is Infinity/],
    [change(2, '2,1,internal,1,1,,'), /row 2: the phase is empty/],
    [change(2, '2,1,intrnal,1,1,0,'), /row 2: there is no role "intrnal"/],
    [change(2, '2.5,1,internal,1,1,0,'), /row 2: shifter is 2.5/],
    [change(2, '2,1,internal,1,1,0'), /row 2: there are 6 fields/],
    [json.replace('"format": 1', '"format": 7'), /format 7/],
    [json.replace('"format": 1', '"vormat": 1'), /no format key/],
    [json.replace('"shifters"', '"shiftres"'), /no shifters/],
    [
      json.replace('"modes": 3,\n    "matrix": [', '"modes": 3,\n    "matrix": [[[1,2]],'),
      /row 1 does not have 4/,
    ],
    [json.replace('"role":"external"', '"role":7'), /row 1: there is no role 7/],
    [json.replace('{"shifter":1,', '{"shifter":"1",'), /row 1: shifter is "1"/],
    [json.slice(0, 300), /not JSON/],
  ])('%#: %s', (text, message) => {
    expect(fault(text).message).toMatch(message);
  });

  it('names the field of the chip inside a phases.json', () => {
    const broken = json.replace('"chip": {', '"chip": { "laiout": "rectangular",');
    expect(fault(broken).message).toContain('chip.laiout: unknown key');
  });
});

describe('limitSettings', () => {
  it('leaves settings in range to the bit and moves others by turns that change nothing', () => {
    for (const cellStyle of ALL_STYLES) {
      const { chip } = chipFromDocument({ modes: 4, cellStyle });
      const { settings } = programChip(chip, haarUnitary(4, 5)).program;
      const shifted = {
        internal: settings.internal.map((theta) => theta + 4 * Math.PI),
        external: settings.external.map((phi) => phi - 2 * Math.PI),
        port: settings.port!.map((phase) => phase + 6 * Math.PI),
      };
      const ranged = { ...chip, shifterRange: [0, 2 * Math.PI] as const };
      const limited = limitSettings(ranged, shifted);
      // All of them had to be moved, and are listed with what they were moved to.
      expect(limited.outOfRange).toHaveLength(16);
      for (const { wantedRad, setRad } of limited.outOfRange) {
        expect(Math.abs(Math.sin((wantedRad - setRad) / 2))).toBeLessThan(1e-14);
      }
      expect(maxDifference(simulate(chip, limited.settings), simulate(chip, shifted))).toBeLessThan(1e-13);
      for (const phase of limited.settings.internal) expect(phase).toBeLessThanOrEqual(2 * Math.PI);
      expect(limitSettings(ranged, settings).settings).toEqual(settings);
    }
  });

  it('does not take a turn of 2 pi for nothing on a differential pair', () => {
    const { chip } = chipFromDocument({
      modes: 2,
      cellStyle: { internal: 'differential' },
      shifterLimits: { rangeRad: [0, 3] },
    });
    const settings = {
      internal: Float64Array.of(7),
      external: Float64Array.of(1),
      port: Float64Array.of(0, 0),
    };
    const limited = limitSettings(chip, settings);
    expect(limited.settings.internal[0]).toBe(3);
    expect(limited.outOfRange).toEqual([{ shifterIndex: 1, wantedRad: 7, setRad: 3 }]);
  });
});

import { describe, expect, it } from 'vitest';
import type { Chip } from '../../src/chip/Chip.js';
import { externalAtOutput } from '../../src/chip/Chip.js';
import { idealChip } from '../../src/chip/idealChip.js';
import { listShifters, phaseOf, shifterCount } from '../../src/chip/shifters.js';
import { InputError } from '../../src/errors/InputError.js';
import type { MeshFigureOptions } from '../../src/figure/drawMeshFigure.js';
import { drawMeshFigure } from '../../src/figure/drawMeshFigure.js';
import { phaseColour } from '../../src/figure/phaseColour.js';
import { LAYOUTS, MIRRORS } from '../../src/mesh/Mesh.js';
import type { Box } from './figureParts.js';
import {
  blockBox,
  byId,
  crosses,
  guidePolylines,
  heightAt,
  named,
  numberOf,
  ofClass,
  overlap,
  someSettings,
  STYLES,
  textBox,
} from './figureParts.js';
import type { XmlElement } from './readXml.js';
import { allElements, inherited, readXml } from './readXml.js';

const LONG_NAMES = ['signal', 'idler', 'WWWWWWWWWWWWWWWWWWWWWWWW', 'a name of 24 characters.', '', 'x'];

function draw(chip: Chip, options: MeshFigureOptions = {}, salt = 1): XmlElement {
  return readXml(drawMeshFigure(chip, someSettings(chip, salt), options));
}

function pageSize(root: XmlElement): { width: number; height: number } {
  const [x, y, width, height] = root.attributes.get('viewBox')!.split(' ').map(Number);
  expect([x, y]).toEqual([0, 0]);
  expect(root.attributes.get('width')).toBe(`${width}mm`);
  expect(root.attributes.get('height')).toBe(`${height}mm`);
  return { width: width!, height: height! };
}

function textBoxes(root: XmlElement): Box[] {
  return named(root, 'text').map(textBox);
}

/** Nothing overlaps, nothing leaves the page, nothing is too small: what a printed page needs. */
function expectLegible(root: XmlElement, what: string): void {
  const { width, height } = pageSize(root);
  const texts = textBoxes(root);
  const blocks = ofClass(root, 'block').map(blockBox);
  const boxes = [...texts, ...blocks];
  for (const box of boxes) {
    const inside = box.left >= 0 && box.right <= width && box.top >= 0 && box.bottom <= height;
    if (!inside) expect.fail(`${what}: ${box.what} leaves the page: ${JSON.stringify(box)}`);
  }
  for (let i = 0; i < texts.length; i++) {
    for (let j = i + 1; j < boxes.length; j++) {
      if (overlap(texts[i]!, boxes[j]!)) expect.fail(`${what}: ${texts[i]!.what} overlaps ${boxes[j]!.what}`);
    }
  }
  for (let i = 0; i < blocks.length; i++) {
    for (let j = i + 1; j < blocks.length; j++) {
      if (overlap(blocks[i]!, blocks[j]!))
        expect.fail(`${what}: ${blocks[i]!.what} overlaps ${blocks[j]!.what}`);
    }
  }
  for (const guide of guidePolylines(root)) {
    for (const text of texts)
      if (crosses(guide, text)) expect.fail(`${what}: a guide runs through ${text.what}`);
  }
  for (const text of named(root, 'text')) {
    // The viewBox's unit is a printed millimetre; a point is 25.4/72 mm.
    expect(numberOf(text, 'font-size') * (72 / 25.4)).toBeGreaterThanOrEqual(6);
  }
}

describe('a mesh figure is legible', () => {
  const everySize = Array.from({ length: 12 }, (_, i) => i + 1);
  it.each(everySize)('with %i ports, in both layouts, all mirrors and a spread of styles', (modes) => {
    let styleIndex = 7 * modes;
    for (const layout of LAYOUTS) {
      for (const mirror of MIRRORS) {
        const style = STYLES[styleIndex++ % STYLES.length]!;
        const names = Array.from({ length: modes }, (_, i) => LONG_NAMES[i % LONG_NAMES.length]!);
        const chip: Chip = {
          ...idealChip(modes, { layout, mirror, style, portShifters: styleIndex % 3 !== 0 }),
          portNames: styleIndex % 2 === 0 ? names : null,
        };
        const options = {
          title: 'A title that is long enough to be wrapped in a page column of 85 mm, and then once more',
          captionLines: ['Target: haar(12, 7).', 'Fidelity 0.999999; '.repeat(12)],
          cellNumbers: true,
        };
        const root = draw(chip, options, styleIndex);
        const what = `${modes} ${layout} ${mirror} ${JSON.stringify(style)}`;
        expectLegible(root, what);
        expect(ofClass(root, 'number'), what).toHaveLength(shifterCount(chip));
        expect(pageSize(root).width, what).toBeLessThanOrEqual(178);
      }
    }
  });

  it('in every style, with and without port shifters', () => {
    for (const style of STYLES) {
      for (const portShifters of [true, false]) {
        const width = style.splitterForm === 'real' ? 'one-column' : 'two-column';
        const root = draw(idealChip(5, { style, portShifters }), { width, cellNumbers: true });
        expectLegible(root, `${JSON.stringify(style)} ${portShifters} ${width}`);
        expect(ofClass(root, 'number')).toHaveLength(portShifters ? 25 : 20);
        expect(ofClass(root, 'cell-number').map((text) => text.text)).toEqual(
          '1 2 3 4 5 6 7 8 9 10'.split(' '),
        );
      }
    }
  });

  it('with every phase at its widest, negative and beyond a turn', () => {
    const chip = idealChip(6);
    const wide = { external: new Float64Array(15).fill(-44), internal: new Float64Array(15).fill(-44) };
    const root = readXml(drawMeshFigure(chip, { ...wide, port: new Float64Array(6).fill(-44) }));
    expectLegible(root, 'wide numbers');
    expect(ofClass(root, 'number')[0]!.text).toBe('−14.006π');
  });

  it('from 13 to 64 ports, without numbers, in at most two page columns', () => {
    for (const layout of LAYOUTS) {
      for (const modes of [13, 21]) {
        for (const style of [STYLES[0]!, STYLES[11]!, STYLES[17]!]) {
          const root = draw(idealChip(modes, { layout, style }), { title: 'title' });
          expectLegible(root, `${layout} ${modes}`);
          expect(ofClass(root, 'number')).toHaveLength(0);
          expect(pageSize(root).width).toBeLessThanOrEqual(178);
        }
      }
    }
  });

  it('with 64 ports, drawn in a few seconds at most', () => {
    const chip = idealChip(64, { layout: 'triangular' });
    const start = performance.now();
    const root = draw(chip);
    expect(performance.now() - start).toBeLessThan(10_000);
    expect(named(root, 'g').filter((g) => g.attributes.has('data-cell'))).toHaveLength(2016);
    expect(named(root, 'g').filter((g) => g.attributes.has('data-shifter'))).toHaveLength(4096);
    const labels = textBoxes(root);
    for (let i = 0; i < labels.length; i++) {
      for (let j = 0; j < i; j++) expect(overlap(labels[i]!, labels[j]!)).toBe(false);
    }
  });
});

describe('a mesh figure shows the chip', () => {
  it('has a group per cell and per shifter, numbered from 1, each with a title', () => {
    for (const style of [STYLES[0]!, STYLES[20]!]) {
      const chip = {
        ...idealChip(4, { style }),
        shifterNames: new Map([[2, 'H<3>']]),
        portNames: ['in & out', '', '', ''],
      };
      const settings = someSettings(chip);
      const root = draw(chip);
      for (let cell = 1; cell <= 6; cell++) {
        const group = byId(root, `cell-${cell}`);
        expect(group.attributes.get('data-cell')).toBe(String(cell));
        expect(group.children[0]!.name).toBe('title');
        expect(group.children[0]!.text).toContain(`cell ${cell}, column `);
        expect(group.children[0]!.text).toContain(
          `external phase ${settings.external[cell - 1]!.toFixed(4)} rad`,
        );
        expect(group.children[0]!.text).toContain('coupling ratios 0.5 and 0.5');
      }
      expect(byId(root, 'cell-1').children[0]!.text).toContain('ports 1 (in & out) and 2');
      const shifters = listShifters(chip);
      expect(shifters).toHaveLength(16);
      for (const shifter of shifters) {
        const group = byId(root, `shifter-${shifter.index + 1}`);
        expect(group.attributes.get('data-shifter')).toBe(String(shifter.index + 1));
        expect(group.children[0]!.text).toContain(`${shifter.role}`);
        expect(group.children[0]!.text).toContain(`${phaseOf(settings, shifter).toFixed(4)} rad`);
        const owner = shifter.cellIndex === null ? 'mesh' : `cell-${shifter.cellIndex + 1}`;
        expect(group.parent!.attributes.get('id')).toBe(owner);
      }
      expect(byId(root, 'shifter-3').children[0]!.text).toContain('shifter 3 (H<3>), ');
    }
  });

  it('writes beside each shifter its phase, and colours it so', () => {
    const chip = idealChip(7, { layout: 'triangular', mirror: 'ports' });
    const settings = someSettings(chip, 4);
    const root = draw(chip, {}, 4);
    for (const shifter of listShifters(chip)) {
      const group = byId(root, `shifter-${shifter.index + 1}`);
      const phase = phaseOf(settings, shifter);
      const label = ofClass(group, 'number')[0]!.text;
      const back = label === '0' ? 0 : label === 'π' ? 1 : Number(label.slice(0, -1));
      expect(Math.abs(back * Math.PI - phase)).toBeLessThan(0.00051 * Math.PI);
      expect(ofClass(group, 'block')[0]!.attributes.get('fill')).toBe(phaseColour(phase));
      const [, x0, y0, x1, y1] = /^M(\S+) (\S+)L(\S+) (\S+)$/.exec(
        ofClass(group, 'hand')[0]!.attributes.get('d')!,
      )!;
      const angle = Math.atan2(Number(y0) - Number(y1), Number(x1) - Number(x0));
      expect(Math.cos(angle - phase)).toBeGreaterThan(0.999);
    }
  });

  it('puts every shifter on the guide and at the place where the chip has it, in all styles', () => {
    for (const style of STYLES) {
      for (const layout of LAYOUTS) {
        const chip = idealChip(5, { style, layout, mirror: 'columns' });
        const root = draw(chip);
        const guides = guidePolylines(root);
        expect(guides).toHaveLength(5);
        for (const shifter of listShifters(chip)) {
          const blocks = ofClass(byId(root, `shifter-${shifter.index + 1}`), 'block').map(blockBox);
          const differential = shifter.role === 'internal' && style.internal === 'differential';
          expect(blocks).toHaveLength(differential ? 2 : 1);
          blocks.forEach((block, i) => {
            const x = (block.left + block.right) / 2;
            const y = (block.top + block.bottom) / 2;
            // Lengths are rounded to a micrometre.
            expect(Math.abs(heightAt(guides[shifter.portIndex + i]!, x) - y)).toBeLessThan(0.005);
            expect(splittersBefore(chip, root, guides, shifter.cellIndex, x)).toBe(
              wantedSplittersBefore(chip, shifter),
            );
          });
        }
      }
    }
  });

  it.each([
    ['twice', 2],
    ['three times', 3],
  ] as const)(
    'brings the two guides of a cell together %s, and no others, which never cross',
    (_, splitters) => {
      for (const layout of LAYOUTS) {
        const chip = idealChip(6, { layout, style: { ...STYLES[0]!, splitters } });
        const root = draw(chip);
        const guides = guidePolylines(root);
        const pitch = guides[1]![0]![1] - guides[0]![0]![1];
        for (let upper = 0; upper < 5; upper++) {
          let meetings = 0;
          let wasClose = false;
          const end = guides[0]!.at(-1)![0];
          for (let x = guides[0]![0]![0]; x < end; x += 0.05) {
            const distance = heightAt(guides[upper + 1]!, x) - heightAt(guides[upper]!, x);
            expect(distance).toBeGreaterThan(0.3);
            const isClose = distance < 0.25 * pitch;
            if (isClose && !wasClose) meetings++;
            wasClose = isClose;
          }
          const cells = [...chip.mesh.upperPortIndex].filter((port) => port === upper).length;
          expect(meetings).toBe(splitters * cells);
        }
      }
    },
  );

  it('marks real splitters, and only those', () => {
    const marks = (splitterForm: 'real' | 'symmetric', splitters: 2 | 3 = 2): XmlElement[] =>
      allElements(draw(idealChip(4, { style: { ...STYLES[0]!, splitterForm, splitters } }))).filter(
        (element) => element.attributes.get('id') === 'splitter-marks',
      );
    expect(marks('symmetric')).toHaveLength(0);
    expect(marks('real')[0]!.attributes.get('d')!.match(/M/g)).toHaveLength(12);
    expect(marks('real', 3)[0]!.attributes.get('d')!.match(/M/g)).toHaveLength(18);
  });

  it('labels ports at both ends and columns below, counted from 1', () => {
    const root = draw({ ...idealChip(4), portNames: ['a', 'b', '', 'd'] });
    for (const side of ['input-ports', 'output-ports']) {
      expect(named(byId(root, side), 'text').map((text) => text.text)).toEqual(['1 a', '2 b', '3', '4 d']);
    }
    const columns = named(byId(root, 'columns'), 'text').map((text) => text.text);
    expect(columns).toEqual(['column', '1', '2', '3', '4']);
    expect(inherited(named(byId(root, 'output-ports'), 'text')[0]!, 'text-anchor')).toBe('start');
  });
});

/**
 * How many of its cell's splitters lie wholly before x: drawn parts of the path, not the layout's numbers.
 */
function splittersBefore(
  chip: Chip,
  root: XmlElement,
  guides: ReturnType<typeof guidePolylines>,
  cellIndex: number | null,
  x: number,
): number {
  if (cellIndex === null) return -1;
  const guide = guides[chip.mesh.upperPortIndex[cellIndex]!]!;
  const area = ofClass(byId(root, `cell-${cellIndex + 1}`), 'area').map(blockBox)[0]!;
  const rest = guide[0]![1];
  let before = 0;
  let wasLow = false;
  for (let at = area.left; at < x; at += 0.02) {
    const isLow = Math.abs(heightAt(guide, at) - rest) > 0.5;
    if (wasLow && !isLow) before++;
    wasLow = isLow;
  }
  expect(wasLow).toBe(false);
  return before;
}

function wantedSplittersBefore(chip: Chip, { role }: { readonly role: string }): number {
  if (role === 'input' || role === 'output') return -1;
  if (externalAtOutput(chip.style)) return role === 'internal' ? 1 : 2;
  // A third splitter is the first of all that the light meets.
  const outer = chip.style.splitters - 2;
  return role === 'internal' ? outer + 1 : outer;
}

describe('a mesh figure is safe and repeatable', () => {
  it('keeps markup in names as text and drops control characters', () => {
    const hostile = '<script>alert("1")</script> & \u0000\u001b[31m\u202e]]>';
    const chip = {
      ...idealChip(3),
      name: hostile,
      portNames: [hostile, 'b', 'c'],
      shifterNames: new Map([[0, hostile]]),
    };
    const svg = drawMeshFigure(chip, someSettings(chip), {
      title: hostile,
      captionLines: [hostile, '\u0007'],
    });
    const root = readXml(svg);
    const kept = '<script>alert("1")</script> & [31m ]]>';
    expect(named(root, 'script')).toHaveLength(0);
    expect(root.children[0]!.text).toBe(kept);
    expect(
      named(byId(root, 'title-lines'), 'text')
        .map((line) => line.text)
        .join(' '),
    ).toBe(kept);
    expect(
      named(byId(root, 'caption-lines'), 'text')
        .map((line) => line.text)
        .join(' '),
    ).toBe(kept);
    expect(named(byId(root, 'input-ports'), 'title')[0]!.text).toBe(`input port 1 (${kept})`);
    expect(byId(root, 'shifter-1').children[0]!.text).toContain(kept);
  });

  it('describes itself to those who do not see it', () => {
    const root = draw(idealChip(4, { layout: 'triangular', portShifters: false }), { title: 'My chip' });
    expect(root.attributes.get('role')).toBe('img');
    expect(root.attributes.get('xmlns')).toBe('http://www.w3.org/2000/svg');
    expect(root.children.slice(0, 2).map((child) => child.name)).toEqual(['title', 'desc']);
    expect(root.children[0]!.text).toBe('My chip');
    expect(root.children[1]!.text).toContain('4 ports, 6 cells in 5 columns, without port shifters');
  });

  it('gives the same bytes for the same input, whatever was drawn before', () => {
    const chip = idealChip(5);
    const once = drawMeshFigure(chip, someSettings(chip), { title: 'a' });
    draw(idealChip(3, { layout: 'triangular' }), { title: 'b' });
    expect(drawMeshFigure(chip, someSettings(chip), { title: 'a' })).toBe(once);
    const ids = allElements(readXml(once)).flatMap((element) => element.attributes.get('id') ?? []);
    expect(new Set(ids).size).toBe(ids.length);
  });
});

describe('the width of a mesh figure', () => {
  it('is one page column where the mesh is comfortable in it, else two', () => {
    expect(pageSize(draw(idealChip(6))).width).toBe(85);
    expect(pageSize(draw(idealChip(10))).width).toBe(178);
    expect(pageSize(draw(idealChip(4, { layout: 'triangular' }))).width).toBe(85);
    expect(pageSize(draw(idealChip(12, { layout: 'triangular' }))).width).toBe(178);
    expect(pageSize(draw(idealChip(6), { width: 120 })).width).toBe(120);
  });

  it('grows beyond two page columns only for numbers that were asked for', () => {
    const root = draw(idealChip(13, { layout: 'triangular' }), { numbers: true });
    expect(pageSize(root).width).toBeGreaterThan(178);
    expectLegible(root, 'with numbers');
    expect(pageSize(draw(idealChip(24))).width).toBe(178);
  });

  it('leaves numbers out by itself when a given width has no room, and says so when they were asked for', () => {
    const chip = idealChip(12);
    expect(ofClass(draw(chip, { width: 85 }), 'number')).toHaveLength(0);
    expect(ofClass(draw(idealChip(4), { numbers: false }), 'number')).toHaveLength(0);
    expect(() => draw(chip, { width: 85, numbers: true })).toThrow(InputError);
    expect(() => draw(chip, { width: 85, numbers: true })).toThrow(
      '85 mm wide has no room for 12 columns with numbers',
    );
    expect(() => draw(idealChip(64, { layout: 'triangular' }), { width: 30 })).toThrow(InputError);
    for (const width of [0, -1, 29, 5001, NaN, Infinity])
      expect(() => draw(chip, { width })).toThrow(InputError);
  });

  it('refuses settings that are not the chip’s', () => {
    const chip = idealChip(4);
    const settings = someSettings(chip);
    expect(() => drawMeshFigure(chip, { ...settings, port: null })).toThrow(RangeError);
    expect(() => drawMeshFigure(chip, { ...settings, external: new Float64Array(5) })).toThrow(RangeError);
    expect(() => drawMeshFigure(chip, { ...settings, internal: new Float64Array(6).fill(NaN) })).toThrow(
      RangeError,
    );
  });
});

import { spawnSync } from 'node:child_process';
import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, describe, expect, it } from 'vitest';
import { chipFromDocument } from '../../src/chip/readChip.js';
import { drawMeshFigure } from '../../src/figure/drawMeshFigure.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import { programChip } from '../../src/program/programChip.js';

const folder = mkdtempSync(join(tmpdir(), 'phasewright-render-'));
afterAll(() => rmSync(folder, { recursive: true, force: true }));

/**
 * Renders with rsvg-convert (Debian's librsvg2-bin) and returns what it says and the picture's size in
 * pixels.
 */
function render(svg: string, name: string): { messages: string; width: number; height: number } {
  const path = join(folder, `${name}.svg`);
  const png = join(folder, `${name}.png`);
  writeFileSync(path, svg);
  const { status, stderr } = spawnSync('rsvg-convert', ['--dpi-x', '96', '--dpi-y', '96', path, '-o', png], {
    encoding: 'utf8',
  });
  expect(status, stderr).toBe(0);
  const bytes = readFileSync(png);
  return { messages: stderr, width: bytes.readUInt32BE(16), height: bytes.readUInt32BE(20) };
}

describe('mesh figures, rendered by librsvg', () => {
  it.each([
    [{ modes: 1 }, undefined],
    [{ modes: 4 }, 85],
    [
      { modes: 8, layout: 'triangular', cellStyle: { internal: 'differential', splitterForm: 'real' } },
      undefined,
    ],
    [{ modes: 12, mirror: 'both', cellStyle: { external: 'lower-output' }, portShifters: false }, undefined],
    [{ modes: 24, layout: 'triangular', mirror: 'ports' }, 178],
    [{ modes: 64 }, 178],
    [{ modes: 3, name: '<b>&amp;\u00e9', portNames: ['<a>', '&', '"'] }, undefined],
  ])('%j', (document, width) => {
    const { chip } = chipFromDocument(document);
    const { settings } = programChip(chip, haarUnitary(chip.mesh.modes, 1)).program;
    const svg = drawMeshFigure(chip, settings, {
      title: chip.name,
      captionLines: ['a caption'],
      ...(width === undefined ? {} : { width }),
    });
    const { messages, ...size } = render(svg, `mesh-${chip.mesh.modes}`);
    expect(messages).toBe('');
    const [, mmWide, mmHigh] = /width="([\d.]+)mm" height="([\d.]+)mm"/.exec(svg)!.map(Number);
    if (width !== undefined) expect(mmWide).toBe(width);
    // 96 dots an inch, as CSS has it.
    expect(Math.abs(size.width - (mmWide! / 25.4) * 96)).toBeLessThanOrEqual(1);
    expect(Math.abs(size.height - (mmHigh! / 25.4) * 96)).toBeLessThanOrEqual(1);
  });
});

import { describe, expect, it } from 'vitest';
import { describeRefusals } from './refusals.js';
import type { Refusal } from './refusals.js';
import { freshFolder, runCommand } from './runCommand.js';

const DFT = ['yield', 'dft(3)'];
const SPREAD = [...DFT, '--sigma', '0.02'];

/** A chip file with this process block. */
function process(block: string, says: RegExp, mends: RegExp): Refusal {
  return {
    args: [...DFT, '--chip', 'c.chip.json'],
    files: { 'c.chip.json': `{"modes": 3, "process": ${block}}` },
    says,
    mends,
  };
}

function option(args: readonly string[], says: RegExp, mends: RegExp): Refusal {
  return { args, says, mends };
}

const FAULTS: readonly Refusal[] = [
  option(DFT, /nothing makes the chips differ/, /--sigma 0\.02, --error .* or a process block/),
  option([...DFT, '--sigma', '0'], /nothing makes the chips differ/, /--sigma/),
  option([...DFT, '--error', 'pairCorrelation=0.5'], /nothing makes the chips differ/, /--sigma/),
  option([...DFT, '--sigma', '-0.02'], /sigma is -0\.02/, /not negative/),
  option([...DFT, '--sigma', 'small'], /--sigma small: this is not a number/, /--sigma 0\.02/),
  option([...DFT, '--error', 'phaseSigma=-1'], /phaseSigma is -1/, /not negative/),
  option([...DFT, '--error', 'lossSigmaDb=-1'], /lossSigmaDb is -1/, /not negative/),
  option([...DFT, '--error', 'bits=8.5'], /bits is 8\.5/, /whole number of bits/),
  option([...DFT, '--error', 'bit=8'], /no error source bit/, /Did you mean bits\?/),
  option([...DFT, '--error', 'bits'], /--error bits: this is not a name and a number/, /bits=8/),
  option([...SPREAD, '--error', 'pairCorrelation=2'], /pairCorrelation is 2/, /from -1 to 1/),
  option(
    [...DFT, '--error', 'bits=8', '--error', 'correlationLength=2'],
    /nothing to correlate/,
    /sigma or sigmaAngle/,
  ),
  process('{"sigma": -0.1}', /^error: c\.chip\.json, process\.sigma/, /./),
  process('{"sigma": 0.1, "pairCorrelation": -1.5}', /process\.pairCorrelation/, /-1/),
  process('{"sigma": 0.1, "bits": 33}', /process\.bits/, /32/),
  process('{"sigm": 0.1}', /process.*sigm/, /Did you mean sigma\?/),
  process('{"sigma": 0.1, "distribution": "cauchy"}', /process\.distribution/, /normal/),
  process(
    '{"sigma": 0.1, "pairCorrelation": 0.5, "distribution": "uniform"}',
    /uniform errors cannot be correlated/,
    /normal distribution/,
  ),
  process('{"biasSigma": 0.1, "correlationLength": 3}', /nothing to correlate/, /sigma or sigmaAngle/),
  option([...SPREAD, '--threshold', 'fidelty=0.9'], /no figure of merit fidelty/, /Did you mean fidelity\?/),
  option([...SPREAD, '--threshold', 'fidelity=1.2'], /no chip can keep that/, /1 at best/),
  option([...SPREAD, '--threshold', 'fidelity=-0.5'], /every chip keeps that/, /from 0 to 1/),
  option([...SPREAD, '--threshold', 'rmsError=-0.1'], /no chip can keep that/, /0 at best/),
  option([...SPREAD, '--threshold', 'transmissionDb=0.1'], /no chip can keep that/, /0 at best/),
  option([...SPREAD, '--threshold', 'fidelity'], /not a name and a number/, /fidelity=0\.99/),
  option([...SPREAD, '--trials', '0'], /--trials 0/, /from 1 to/),
  option([...SPREAD, '--trials', '1.5'], /--trials 1\.5/, /whole number/),
  option([...SPREAD, '--trial', '0'], /--trial 0/, /from 1 to/),
  option([...SPREAD, '--seed', '-1'], /--seed -1/, /from 0 to/),
  option([...SPREAD, '--workers', '0'], /0 is not a sensible number of workers/, /from 1 to/),
  option([...SPREAD, '--workers', '100000'], /100000 is not a sensible number/, /from 1 to/),
  option([...SPREAD, '--confidence', '1'], /--confidence 1/, /--confidence 0\.95/),
  option([...SPREAD, '--within', '0'], /--within 0/, /--within/),
  option([...SPREAD, '--retune', 'all'], /--retune .*all/, /./),
  option([...DFT, '--sweep', 'sigma=0.01:0.02:0'], /0 points/, /from 1 to 1000/),
  option([...DFT, '--sweep', 'sigma=0.01:0.02'], /not a quantity with a range/, /sigma=0\.005:0\.05:10/),
  option([...DFT, '--sweep', 'sgma=0:1:2'], /no quantity sgma/, /Did you mean sigma\?/),
  option([...DFT, '--sweep', 'sigma=-0.01:0.02:3'], /sigma is -0\.01/, /not negative/),
  option(
    [...DFT, '--sweep', 'sigma=0:0.1:1000', '--trials', '100000000'],
    /1000 times 100000000 trials are more than memory holds/,
    /fewer --trials/,
  ),
  option([...SPREAD, '--sweep', 'pairCorrelation=0:2:3'], /pairCorrelation is 2/, /from -1 to 1/),
  option([...SPREAD, '--sweep', 'modes=2:4:3'], /ports of dft\(3\) is fixed/, /dft\(N\)/),
  option([...SPREAD, '--sweep', 'couplingRatio=0:2:2'], /couplingRatio/, /./),
  option([...SPREAD, '--sweep', 'sigma=0:1:2'], /sigma takes many values/, /Leave out --sigma/),
  option(['yield', 'haar(N)', '--sweep', 'modes=4:8:3'], /no error source/, /--sigma/),
  option([...SPREAD, '--sweep', 'bits=1:2:2', '--budget'], /--sweep and --budget/, /one after the other/),
  option([...SPREAD, '--trial', '1', '--budget'], /--budget and --trial/, /one after the other/),
  option([...SPREAD, '--budget'], /one error source only, sigma/, /give more with --error/),
  option([...SPREAD, '--budget', '--within', '0.1'], /--within does not go with --budget/, /--trials/),
  option([...SPREAD, '--trial', '1', '--resume'], /cannot be resumed/, /--resume/),
  option(['yield', 'dft(N)', '--sigma', '0.02'], /ports N of dft\(N\) is not known/, /--sweep modes/),
  option(['yield', 'haar(N)', '--sigma', '0.02'], /ports N of haar\(N\) is not known/, /--chip/),
  option(['yield', 'haar(0)', '--sigma', '0.02'], /0 ports/, /from 1 to/),
  option(['yield', '2*eye(2)', '--sigma', '0.02'], /./, /./),
  option([...SPREAD, '--out', '/dev/null/x'], /dev\/null/, /another place/),
  {
    args: [...DFT, '--chip', 'c.chip.json', '--sigma', '0.01', '--sweep', 'couplingRatio=0.4:0.6:3'],
    files: {
      'c.chip.json': '{"modes": 3, "measuredCells": [{"cell": 1, "couplingRatio": [0.5, 0.49]}]}',
    },
    says: /measuredCells/,
    mends: /take bias instead/,
  },
  {
    args: [...DFT, '--chip', 'c.chip.json', '--sigma', '0.01', '--error', 'pairCorrelation=-0.6'],
    files: { 'c.chip.json': '{"modes": 3, "cellStyle": {"splitters": 3}}' },
    says: /pairCorrelation is -0\.6, and cells of three splitters allow -0\.5 or more/,
    mends: /from -0\.5 to 1/,
  },
  option(
    ['tolerance', 'dft(3)', '--source', 'correlationLength'],
    /nothing to correlate/,
    /sigma or sigmaAngle/,
  ),
  option(
    ['tolerance', 'dft(3)', '--source', 'pairCorrelation'],
    /nothing to correlate/,
    /sigma or sigmaAngle/,
  ),
  option(
    ['tolerance', 'dft(3)', '--source', 'zzz'],
    /no tolerance is found for zzz/,
    /Sources are sigma.*lossDb/,
  ),
  option(
    ['tolerance', 'dft(3)', '--source', 'mode'],
    /no tolerance is found for mode/,
    /Did you mean modes\?/,
  ),
  option(['tolerance', 'dft(3)', '--source', 'lossDb'], /nothing makes the chips differ/, /--sigma/),
  option(['tolerance', 'dft(N)', '--source', 'modes'], /nothing makes the chips differ/, /--sigma/),
  option(['tolerance', 'dft(N)'], /ports N of dft\(N\) is not known/, /tolerance --source modes/),
  option(['tolerance', 'dft(3)', '--source', 'modes', '--sigma', '0.01'], /dft\(3\) is fixed/, /dft\(N\)/),
  option(
    ['tolerance', 'dft(3)', '--source', 'bits', '--error', 'bits=8'],
    /bits takes many values/,
    /Leave out --error bits/,
  ),
  {
    args: ['tolerance', 'dft(3)', '--chip', 'c.chip.json', '--sigma', '0.01', '--source', 'couplingRatio'],
    files: {
      'c.chip.json': '{"modes": 3, "measuredCells": [{"cell": 1, "couplingRatio": [0.5, 0.49]}]}',
    },
    says: /measuredCells/,
    mends: /take bias instead/,
  },
  {
    args: ['tolerance', 'haar(N)', '--chip', 'c.chip.json', '--sigma', '0.01', '--source', 'modes'],
    files: { 'c.chip.json': '{"modes": 3, "portNames": ["a", "b", "c"]}' },
    says: /portNames, which belong to 3 ports/,
    mends: /--layout/,
  },
  {
    args: ['tolerance', 'dft(3)', '--chip', 'c.chip.json', '--source', 'correlationLength'],
    files: { 'c.chip.json': '{"modes": 3, "process": {"sigma": 0.01, "distribution": "uniform"}}' },
    says: /uniform errors cannot be correlated/,
    mends: /normal distribution/,
  },
  option(['tolerance', 'dft(3)', '--within', '0.1'], /--within/, /./),
  option(['tolerance', 'dft(3)', '--source', 'phaseSigm'], /phaseSigm/, /Did you mean phaseSigma\?/),
  option(['tolerance', 'dft(3)', '--sigma', '0.01'], /sigma takes many values/, /Leave out --sigma/),
  option(['tolerance', 'dft(3)', '--yield', '1.1'], /--yield 1\.1/, /--yield 0\.95/),
  option(['tolerance', 'dft(3)', '--trials', '0'], /--trials 0/, /from 1 to/),
  option(
    ['tolerance', 'dft(3)', '--source', 'phaseSigma', '--error', 'pairCorrelation=0.5'],
    /nothing to correlate/,
    /sigma or sigmaAngle/,
  ),
  option(['tolerance', 'dft(3)', '--workers', '0'], /0 is not a sensible number/, /from 1 to/),
];

describeRefusals('yield and tolerance refuse, with a line that says what and one that mends', FAULTS);

describe('a run that is refused', () => {
  it('leaves results of another run alone', async () => {
    const folder = freshFolder();
    const args = ['yield', 'dft(2)', '--sigma', '0.02', '--trials', '4', '--out', 'r', '--quiet'];
    await runCommand(args, { folder });
    const other = await runCommand([...args, '--seed', '3'], { folder });
    expect(other.code).toBe(2);
    expect(other.stderr).toMatch(/r: the results of another run are there .*\n.*--force/);
    expect(other.listing).not.toContain('r/.partial/');
    const forced = await runCommand([...args, '--seed', '3', '--force'], { folder });
    expect([forced.code, JSON.parse(await forced.read('r/report.json'))]).toMatchObject([0, { seed: 3 }]);
  });
});

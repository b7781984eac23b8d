import { idealChip } from '../../src/chip/idealChip.js';
import { reachOfChip } from '../../src/chip/reachOfChip.js';
import { decompose, decomposeFromFarSide } from '../../src/decompose/decompose.js';
import { decomposeWith } from '../../src/decompose/decomposeWith.js';
import { nullReadably } from '../../src/decompose/nullReadably.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import { createMesh, LAYOUTS } from '../../src/mesh/Mesh.js';
import { randomStream } from '../../src/random/RandomStream.js';
import { machineLine, medianOf, startYardstick } from './measuring.js';

const SIZES = [8, 16, 32, 64, 128, 256];
/** Standard deviation of the splitters' angles where cells have a reach. */
const SPREAD = 0.05;
/** The most that nulling with a reach may take, from both sides together, in units of the plain one. */
const MOST_FOR_REACH = 3;

/** Median time of a function in microseconds: short runs are put together to 0.2 ms, for half a second. */
function median(run: () => void): number {
  for (let k = 0; k < 3; k++) run();
  const first = performance.now();
  run();
  const together = 1 + Math.floor(0.2 / (performance.now() - first));
  const times: number[] = [];
  const end = performance.now() + 500;
  do {
    const start = performance.now();
    for (let k = 0; k < together; k++) run();
    times.push((performance.now() - start) / together);
  } while (times.length < 3 || performance.now() < end);
  return 1000 * medianOf(times);
}

const print = (line: string): void => void process.stdout.write(`${line}\n`);
const cell = (value: number): string => value.toPrecision(3).padStart(12);

const yardstick = await startYardstick('zgeqrf.py');
print(`${machineLine()}; medians in us; one core`);
print('decompose as a whole, phases of the diagonal included, angles of the cells (carrying sweep) not');
print(
  yardstick === null
    ? 'no yardstick: python3 with SciPy was not found'
    : `yardstick: zgeqrf, lwork = 32 n, one thread, ${yardstick.version}, in the same run`,
);
const yardstickTitles = yardstick === null ? '' : '      zgeqrf ours/zgeqrf';
print(`   N  layout        decompose   plain twin${yardstickTitles}`);
for (const modes of SIZES) {
  const target = haarUnitary(modes, 1);
  for (const layout of LAYOUTS) {
    const mesh = createMesh(layout, modes);
    const ours = median(() => decompose(target, mesh));
    const twin = median(() => decomposeWith(nullReadably, target, mesh));
    const theirs = yardstick === null ? null : await yardstick.ask(String(modes));
    const compared = theirs === null ? '' : `${cell(theirs)}${cell(ours / theirs)}`;
    print(`${String(modes).padStart(4)}  ${layout.padEnd(11)}${cell(ours)} ${cell(twin)}${compared}`);
  }
}
yardstick?.close();

print(
  `with a reach: splitter angles scattered by ${SPREAD}; from one side, and from both as retuning mesh does`,
);
print('   N  layout            plain     one side   both sides   both/plain');
for (const modes of SIZES) {
  const target = haarUnitary(modes, 1);
  for (const layout of LAYOUTS) {
    const { mesh, couplingRatios, ...rest } = idealChip(modes, { layout });
    const random = randomStream(1, 900);
    const scattered = couplingRatios.map(() => Math.sin(Math.PI / 4 + SPREAD * random.normal()) ** 2);
    const reach = reachOfChip({ ...rest, mesh, couplingRatios: scattered });
    const plain = median(() => decompose(target, mesh));
    const oneSide = median(() => decompose(target, mesh, reach));
    const bothSides = median(() => {
      decompose(target, mesh, reach);
      decomposeFromFarSide(target, mesh, reach);
    });
    const ratio = bothSides / plain;
    const verdict = ratio <= MOST_FOR_REACH ? '' : `  more than ${MOST_FOR_REACH}`;
    const figures = [plain, oneSide, bothSides, ratio].map(cell).join(' ');
    print(`${String(modes).padStart(4)}  ${layout.padEnd(11)}${figures}${verdict}`);
  }
}

import { decompose } from '../../src/decompose/decompose.js';
import { decomposeWith } from '../../src/decompose/decomposeWith.js';
import { nullReadably } from '../../src/decompose/nullReadably.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import { createMesh, LAYOUTS } from '../../src/mesh/Mesh.js';
import { machineLine, medianOf, startYardstick } from './measuring.js';

const SIZES = [8, 16, 32, 64, 128, 256];

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

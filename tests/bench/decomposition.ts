import { spawn } from 'node:child_process';
import { cpus } from 'node:os';
import { createInterface } from 'node:readline';
import { fileURLToPath } from 'node:url';
import { decompose } from '../../src/decompose/decompose.js';
import { decomposeWith } from '../../src/decompose/decomposeWith.js';
import { nullReadably } from '../../src/decompose/nullReadably.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import { createMesh, LAYOUTS } from '../../src/mesh/Mesh.js';

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
  return 1000 * times.sort((a, b) => a - b)[times.length >> 1]!;
}

interface Yardstick {
  readonly version: string;
  /** Median time of zgeqrf in microseconds. */
  measure(modes: number): Promise<number>;
  close(): void;
}

/** zgeqrf by way of SciPy, measured between our own measurements; null when there is no Python with SciPy. */
async function startYardstick(): Promise<Yardstick | null> {
  const script = fileURLToPath(new URL('zgeqrf.py', import.meta.url));
  const python = spawn('python3', [script], { stdio: ['pipe', 'pipe', 'ignore'] });
  python.on('error', () => undefined);
  python.stdin.on('error', () => undefined);
  const lines = createInterface({ input: python.stdout })[Symbol.asyncIterator]();
  const first = await lines.next();
  if (first.done === true) return null;
  return {
    version: first.value,
    measure: async (modes) => {
      python.stdin.write(`${modes}\n`);
      return Number((await lines.next()).value);
    },
    close: () => void python.stdin.end(),
  };
}

const print = (line: string): void => void process.stdout.write(`${line}\n`);
const cell = (value: number): string => value.toPrecision(3).padStart(12);

const yardstick = await startYardstick();
print(`${cpus()[0]?.model ?? 'unknown processor'}, Node ${process.version}; medians in us; one core`);
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
    const theirs = yardstick === null ? null : await yardstick.measure(modes);
    const compared = theirs === null ? '' : `${cell(theirs)}${cell(ours / theirs)}`;
    print(`${String(modes).padStart(4)}  ${layout.padEnd(11)}${cell(ours)} ${cell(twin)}${compared}`);
  }
}
yardstick?.close();

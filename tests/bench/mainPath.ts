import { idealChip } from '../../src/chip/idealChip.js';
import { decompose } from '../../src/decompose/decompose.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import { multiply } from '../../src/matrix/products.js';
import { LAYOUTS } from '../../src/mesh/Mesh.js';
import { carryingSweep } from '../../src/program/carryingSweep.js';
import { simulate } from '../../src/simulate/simulate.js';
import { machineLine, medianOf } from './measuring.js';

/** Median of the times of a function in milliseconds: at least three runs, about half a second in all. */
function median(run: () => void): number {
  run();
  const times: number[] = [];
  const end = performance.now() + 500;
  do {
    const start = performance.now();
    run();
    times.push(performance.now() - start);
  } while (times.length < 3 || performance.now() < end);
  return medianOf(times);
}

function shown(milliseconds: number): string {
  return milliseconds.toPrecision(3).padStart(9);
}

const print = (line: string): void => void process.stdout.write(`${line}\n`);
print(`${machineLine()}; medians in ms; one core; nulling by kernels, the rest in TypeScript`);
print('yardstick: one product of two complex N x N matrices, in plain TypeScript, in the same run');
print('   N  layout        decompose   program  simulate       sum   product  sum / product');
for (const modes of [8, 64, 256, 1024]) {
  const target = haarUnitary(modes, 1);
  const product = median(() => multiply(target, target));
  for (const layout of LAYOUTS) {
    const chip = idealChip(modes, { layout });
    const factors = decompose(target, chip.mesh);
    const { settings } = carryingSweep(chip, factors);
    const times = [
      median(() => decompose(target, chip.mesh)),
      median(() => carryingSweep(chip, factors)),
      median(() => simulate(chip, settings)),
    ];
    const sum = times.reduce((a, b) => a + b);
    print(
      `${String(modes).padStart(4)}  ${layout.padEnd(12)}${[...times, sum, product].map(shown).join(' ')}` +
        `${(sum / product).toFixed(2).padStart(15)}`,
    );
  }
}

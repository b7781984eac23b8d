import { idealChip } from '../../src/chip/idealChip.js';
import { phasesInOrder } from '../../src/chip/shifters.js';
import { zeroMatrix } from '../../src/matrix/ComplexMatrix.js';
import { haarUnitary } from '../../src/matrix/haar.js';
import { COST_FIGURES, createCost } from '../../src/merit/createCost.js';
import { LAYOUTS } from '../../src/mesh/Mesh.js';
import { programChip } from '../../src/program/programChip.js';
import { refineSettings } from '../../src/program/refineSettings.js';
import { randomStream } from '../../src/random/RandomStream.js';
import type { FieldMemory } from '../../src/simulate/createFieldSweep.js';
import { createFieldSweep, reserveFieldMemory } from '../../src/simulate/createFieldSweep.js';
import { machineLine, medianOf, processorMicroseconds } from './measuring.js';

/** Median processor time of a function in microseconds: runs are put together to 2 ms, for half a second. */
function median(run: () => void): number {
  for (let k = 0; k < 20; k++) run();
  const first = performance.now();
  run();
  const together = 1 + Math.floor(2 / (performance.now() - first));
  const times: number[] = [];
  const end = performance.now() + 500;
  do {
    const start = processorMicroseconds();
    for (let k = 0; k < together; k++) run();
    times.push((processorMicroseconds() - start) / together);
  } while (times.length < 3 || performance.now() < end);
  return medianOf(times);
}

/** The kernels alone, all panels: fields forward with or without keeping them, adjoint fields back. */
function kernelRuns(memory: FieldMemory): Record<'forward' | 'keep' | 'back', () => void> {
  const { instance, mesh, met, at, keepsFields } = memory;
  const { kernels } = instance;
  const { columns } = mesh;
  /** Calls a function with the addresses of each panel: ranges, history, and behind the history. */
  const eachPanel = (run: (ranges: number, history: number, behind: number) => void): void => {
    let history = at.history;
    met.forEach((cells, panel) => {
      const behind = history + 256 * cells;
      run(at.ranges + 8 * columns * panel, history, behind);
      if (keepsFields) history = behind;
    });
  };
  const forward = (keeps: number): void =>
    eachPanel((ranges, history) =>
      kernels.carryFields(columns, ranges, at.upperPort, at.transfers, at.panel, history, keeps),
    );
  return {
    forward: () => forward(0),
    keep: () => forward(1),
    back: () =>
      eachPanel((ranges, _history, behind) =>
        kernels.carryAdjoints(columns, ranges, at.upperPort, at.transfers, at.panel, behind, at.correlations),
      ),
  };
}

const print = (line: string): void => void process.stdout.write(`${line}\n`);
const cell = (value: number): string => value.toPrecision(3).padStart(11);

print(`${machineLine()}; medians of processor time in us; one core`);
print('kernels: a forward sweep over all inputs, and all that the gradient takes of them');
print('whole: phases to V; phases to V, cost 1 - F and its gradient by all phases');
print('   N    forward   gradient  ratio   whole V  + gradient  ratio');
for (const modes of [8, 16, 32, 64, 128]) {
  const chip = idealChip(modes);
  const target = haarUnitary(modes, 1);
  const phases = phasesInOrder(chip, programChip(chip, target).program.settings);
  const cost = createCost(target, { figure: 'fidelity' });
  const memory = reserveFieldMemory(chip.mesh, cost.inputs);
  const sweep = createFieldSweep(chip, memory);
  const slope = zeroMatrix(modes, modes);
  const gradient = new Float64Array(phases.length);
  const whole = median(() => sweep.forward(phases));
  const withGradient = median(() => {
    cost.evaluate(sweep.forward(phases), slope);
    sweep.backward(slope, gradient);
  });
  const runs = kernelRuns(memory);
  const forward = median(runs.forward);
  // Where the fields are too many to be kept, each panel goes forward once more.
  const kept = (memory.keepsFields ? 0 : forward) + median(runs.keep) + median(runs.back);
  print(
    `${String(modes).padStart(4)}${cell(forward)}${cell(kept)}${(kept / forward).toFixed(2).padStart(7)}` +
      `${cell(whole)}${cell(withGradient)}${(withGradient / whole).toFixed(2).padStart(8)}`,
  );
}

const MODES = 32;
const SIGMA = 0.03;
print('');
print(
  `refinement of a Haar target, N = ${MODES}, coupling ratios 1/2 +- ${SIGMA}, from the correction cell by cell`,
);
print('layout       cost                    iterations      before       after   seconds  stopped');
for (const layout of LAYOUTS) {
  const random = randomStream(1, 950);
  const ideal = idealChip(MODES, { layout });
  const chip = { ...ideal, couplingRatios: ideal.couplingRatios.map(() => 0.5 + SIGMA * random.normal()) };
  const target = haarUnitary(MODES, 1);
  const { settings } = programChip(chip, target).program;
  for (const figure of COST_FIGURES) {
    for (const mostIterations of [300, 5000]) {
      const start = processorMicroseconds();
      const refined = refineSettings(chip, target, [settings], { figure }, { mostIterations });
      const seconds = (processorMicroseconds() - start) / 1e6;
      print(
        `${layout.padEnd(12)} ${figure.padEnd(22)} ${String(refined.iterations).padStart(10)}` +
          `${refined.costBefore.toExponential(2).padStart(13)}${refined.cost.toExponential(2).padStart(12)}` +
          `${seconds.toFixed(2).padStart(10)}  ${refined.stopped}`,
      );
    }
  }
}

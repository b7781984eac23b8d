/** A complex number as real and imaginary part. */
export type Pair = readonly [re: number, im: number];

const times = ([a, b]: Pair, [c, d]: Pair): Pair => [a * c - b * d, a * d + b * c];
const plus = ([a, b]: Pair, [c, d]: Pair): Pair => [a + c, b + d];
const turn = (angle: number): Pair => [Math.cos(angle), Math.sin(angle)];

/**
 * What a phases.csv does on an ideal chip in the reference style, worked out from the text alone with the
 * textbook cell T = i e^{i theta/2} [[e^{i phi} sin(theta/2), cos(theta/2)], [e^{i phi} cos(theta/2),
 * -sin(theta/2)]]: nothing of the program is used. Rows are taken in the order of the file.
 */
export function transferFromCsv(csv: string, modes: number): Pair[][] {
  const transfer: Pair[][] = Array.from({ length: modes }, (_, i) =>
    Array.from({ length: modes }, (_, j): Pair => [i === j ? 1 : 0, 0]),
  );
  let external = 0;
  for (const line of csv.trimEnd().split('\n').slice(1)) {
    const [, , role, , portText, phaseText] = line.split(',');
    const [port, phase] = [Number(portText) - 1, Number(phaseText)];
    if (role === 'external') external = phase;
    else if (role === 'output') transfer[port] = transfer[port]!.map((entry) => times(turn(phase), entry));
    else applyCell(transfer, port, phase, external);
  }
  return transfer;
}

function applyCell(transfer: Pair[][], port: number, theta: number, phi: number): void {
  const front = times([0, 1], turn(theta / 2));
  const [s, c]: [Pair, Pair] = [
    [Math.sin(theta / 2), 0],
    [Math.cos(theta / 2), 0],
  ];
  const [upper, lower] = [transfer[port]!, transfer[port + 1]!];
  const mixed = (left: Pair, right: Pair): Pair[] =>
    upper.map((entry, j) =>
      times(front, plus(times(times(left, turn(phi)), entry), times(right, lower[j]!))),
    );
  transfer[port] = mixed(s, c);
  transfer[port + 1] = mixed(c, [-s[0], 0]);
}

/** Largest distance between entries of two matrices. */
export function largestDistance(a: readonly (readonly Pair[])[], b: readonly (readonly Pair[])[]): number {
  return Math.max(
    ...a.flatMap((row, i) => row.map(([re, im], j) => Math.hypot(re - b[i]![j]![0], im - b[i]![j]![1]))),
  );
}

/** Discrete Fourier transform with positive exponent, from its definition. */
export function fourierMatrix(modes: number): Pair[][] {
  return Array.from({ length: modes }, (_, j) =>
    Array.from({ length: modes }, (_, k): Pair => {
      const [re, im] = turn((2 * Math.PI * j * k) / modes);
      return [re / Math.sqrt(modes), im / Math.sqrt(modes)];
    }),
  );
}

/** Layers of the ziggurat, and doubles for each: right edge, next edge as a share of it, density at it. */
const LAYERS = 256;
const DOUBLES = 3;
/** Doubles that the tables take: one edge more than layers. */
export const ZIGGURAT_SIZE = (LAYERS + 1) * DOUBLES;

/**
 * Where the tail begins, and the area of each layer: Marsaglia and Tsang, J. Stat. Softw. 5, 8 (2000), for
 * 256 layers.
 */
const TAIL = 3.6541528853610088;
const AREA = 0.00492867323399;

/**
 * Writes the tables that `fillNormals` reads. The normal density (without its constant) is covered by layers
 * of one area, from the tail's, which is as wide as its area needs, up to the peak.
 */
export function writeZiggurat(tables: Float64Array): void {
  const density = (x: number): number => Math.exp(-0.5 * x * x);
  const edges = [AREA / density(TAIL), TAIL];
  while (edges.length < LAYERS) {
    const edge = edges[edges.length - 1]!;
    edges.push(Math.sqrt(-2 * Math.log(AREA / edge + density(edge))));
  }
  edges.push(0);
  edges.forEach((edge, layer) => {
    tables[DOUBLES * layer] = edge;
    tables[DOUBLES * layer + 1] = layer < LAYERS ? edges[layer + 1]! / edge : 0;
    tables[DOUBLES * layer + 2] = density(edge);
  });
}

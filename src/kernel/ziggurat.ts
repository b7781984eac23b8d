/** Layers of the ziggurat: one edge more than layers. */
const LAYERS = 512;
/** Where the densities at the edges begin: behind the edges, two doubles each. */
export const DENSITIES_AT = 2 * (LAYERS + 1);
/** Doubles that the tables take. */
export const ZIGGURAT_SIZE = 3 * (LAYERS + 1);

/**
 * Where the tail begins, and the area of each layer, so that 512 layers of one area end at the peak: the
 * condition of Marsaglia and Tsang, J. Stat. Softw. 5, 8 (2000), solved with SciPy's brentq and erfc.
 */
const TAIL = 3.852046150368391;
const AREA = 0.002456766351541357;

/**
 * Writes the tables that `fillNormals` reads: for each layer its right edge and the next edge as a share of it,
 * then the densities at the edges. The normal density (without its constant) is covered by layers
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
    tables[2 * layer] = edge;
    tables[2 * layer + 1] = layer < LAYERS ? edges[layer + 1]! / edge : 0;
    tables[DENSITIES_AT + layer] = density(edge);
  });
}

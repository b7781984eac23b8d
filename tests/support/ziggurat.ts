import type { KernelInstance } from '../../src/kernel/loadKernels.js';
import { writeZiggurat, ZIGGURAT_SIZE } from '../../src/kernel/ziggurat.js';

/** The address of the ziggurat's tables, made in an instance's memory. Views from before may be dead. */
export function layersIn(instance: KernelInstance): number {
  const layers = instance.reserve(ZIGGURAT_SIZE);
  writeZiggurat(instance.doubles(layers, ZIGGURAT_SIZE));
  return layers;
}

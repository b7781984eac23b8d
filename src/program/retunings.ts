/**
 * How the phases of a chip are found when its splitters are known, from the least effort on; on the average
 * each does better than those before it; `mesh` is never worse than `cell`, nor `refine` than `mesh`.
 *
 * - `none`: as if all splitters were at 1/2.
 * - `cell`: every cell makes good its own splitters, and where it cannot stops at the nearest end of its
 *   reach
 *   (Bandyopadhyay, Hamerly, Englund, Optica 8, 1247 (2021)).
 * - `mesh`: what a cell cannot do is passed on in the nulling, and later cells make good what they can of it
 *   (after Hamerly, Bandyopadhyay, Englund, Phys. Rev. Applied 18, 024018 (2022), from memory).
 * - `refine`: from there on all phases together are moved to where a figure of merit has its best value
 *   nearby.
 */
export const RETUNINGS = ['none', 'cell', 'mesh', 'refine'] as const;
/** A way to find the phases of a chip. */
export type Retuning = (typeof RETUNINGS)[number];

export { carryAdjoints, carryFields } from './carry';
export { correlateGrid, correlatePairs, drawRatios, pickPlaces, turnFactors, turnRatios } from './errors';
export { fillNormals, fillUniforms, seedTrials } from './normals';
export { composeCells } from './composeCells';
export { accumulatePanel, judgeTrial, propagatePanel } from './propagate';
export { solveCells } from './solveCells';
export { layOutMatrix } from './nullingMatrix';
export { nullRectangular } from './nullingRectangular';
export { nullTriangular } from './nullingTriangular';

export { carryAdjoints, carryFields } from './carry';
export { correlateGrid, correlatePairs, drawSplitters, pickPlaces, turnFactors, turnSplitters } from './errors';
export { fillNormals, fillUniforms, seedTrials } from './normals';
export { accumulatePanel, composeCells, judgeTrial, propagatePanel } from './propagate';
export { solveCells } from './solveCells';
export { layOutMatrix } from './nullingMatrix';
export { nullRectangular } from './nullingRectangular';
export { nullTriangular } from './nullingTriangular';

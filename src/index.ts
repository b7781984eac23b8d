// Matrices
export type { ComplexMatrix, Entry } from './matrix/ComplexMatrix.js';
export { copyMatrix, identityMatrix, matrixFromRows, zeroMatrix } from './matrix/ComplexMatrix.js';
export { adjoint, conjugate, multiply, reversePorts, subtract, transpose } from './matrix/products.js';
export { frobeniusNorm, oneNorm, unitarityDefect } from './matrix/norms.js';
export { spectralNorm } from './matrix/spectralNorm.js';
export { polarDecomposition, singularValueDecomposition, singularValues } from './matrix/singularValues.js';
export { haarUnitary } from './matrix/haar.js';

// Targets: from bytes or a formula, made ready, and back to bytes
export type { MatrixFileKind } from './target/MatrixFileKind.js';
export { matrixFileKind } from './target/MatrixFileKind.js';
export type { ReadLimits } from './target/limits.js';
export { readMatrices } from './target/readMatrices.js';
export { writeMatrix } from './target/writeMatrix.js';
export type { ExpressionOptions } from './target/evaluateExpression.js';
export { evaluateExpression } from './target/evaluateExpression.js';
export type { PreparedTarget, PrepareOptions } from './target/prepareTarget.js';
export { prepareTarget } from './target/prepareTarget.js';

// Meshes and chips
export type { Layout, Mesh, Mirror } from './mesh/Mesh.js';
export { cellIndexAt, coincidentMirror, columnCount, createMesh } from './mesh/Mesh.js';
export type {
  CellStyle,
  Chip,
  ChipLoss,
  ExternalGuide,
  InternalArm,
  PhaseRange,
  SplitterCount,
  SplitterForm,
} from './chip/Chip.js';
export { externalAtOutput } from './chip/Chip.js';
export type { ChipFile } from './chip/chipSchema.js';
export { chipJsonSchema } from './chip/chipSchema.js';
export type { ReadChip } from './chip/readChip.js';
export { chipFromDocument, readChip } from './chip/readChip.js';
export { resolveChip } from './chip/resolveChip.js';
export type { IdealChipOptions } from './chip/idealChip.js';
export { idealChip } from './chip/idealChip.js';
export type { CellRatios } from './chip/cellSplitters.js';
export { ratiosOfCell, splitterCount } from './chip/cellSplitters.js';
export type { MissedStates, Reach } from './chip/reach.js';
export { cellReach, missedStates } from './chip/reach.js';
export type { BesideFactors, MeshReach } from './chip/MeshReach.js';
export type { StuckShifter } from './chip/stuckShifters.js';
export { isStuck, stuckShifters, withoutStuckShifters } from './chip/stuckShifters.js';
export { meshReach } from './chip/MeshReach.js';
export { besideFactors, reachOfChip } from './chip/reachOfChip.js';
export type { Settings } from './chip/Settings.js';
export type { Shifter, ShifterRole } from './chip/shifters.js';
export { listShifters, phaseOf, phasesInOrder, settingsFromPhases, shifterCount } from './chip/shifters.js';

// From a target to phases
export type { Decomposition } from './decompose/Decomposition.js';
export { reconstruct } from './decompose/Decomposition.js';
export { decompose, decomposeFromFarSide } from './decompose/decompose.js';
export type { OutOfRange, OutOfReach, Program } from './program/carryingSweep.js';
export { carryingSweep } from './program/carryingSweep.js';
export type { ChipPrograms } from './program/programChip.js';
export { programChip } from './program/programChip.js';
export type { CellMargin } from './program/cellMargins.js';
export { cellMargins } from './program/cellMargins.js';
export { randomSettings } from './program/randomSettings.js';
export type { PortAssignment, Reassigned, ReassignOptions, ReassignedSide } from './program/reassignPorts.js';
export { assignedTarget, reassignPorts, sameAssignment } from './program/reassignPorts.js';
export type { DirectRetuning, Retuning } from './program/retunings.js';
export { RETUNINGS } from './program/retunings.js';
export type { LimitedSettings } from './program/limitSettings.js';
export { limitSettings } from './program/limitSettings.js';
export type { HeldShifter, RefinedSettings, RefineOptions } from './program/refineSettings.js';
export { principalSettings } from './program/principalSettings.js';
export type { ThoroughlyRefined } from './program/refineThoroughly.js';
export { refineThoroughly } from './program/refineThoroughly.js';
export { refineInterruptibly, refineSettings } from './program/refineSettings.js';

// What a chip does with them, and how well
export { simulate } from './simulate/simulate.js';
export type { Merit } from './merit/merit.js';
export { figuresOfMerit } from './merit/merit.js';
export type { PortSide } from './merit/portPhaseFree.js';
export { freePorts, missingPortPhases, portPhaseFreeFidelity } from './merit/portPhaseFree.js';
export { judgedFidelity } from './merit/judgedFidelity.js';
export { powerDistance } from './merit/powerDistance.js';
export type { Cost, CostDescription, CostFigure } from './merit/createCost.js';
export { createCost, POWER_SMOOTHING } from './merit/createCost.js';
export type { FieldMemory, FieldSweep } from './simulate/createFieldSweep.js';
export { createFieldSweep, reserveFieldMemory } from './simulate/createFieldSweep.js';

// Minimising
export type { Box, CostAndGradient } from './optimise/Problem.js';
export type { MinimisationProgress, MinimiseOptions, Minimum, StopReason } from './optimise/minimise.js';
export { minimise, minimiseInterruptibly } from './optimise/minimise.js';

// Fabricated chips: errors of a process, trials, yield and tolerance
export type { ErrorDistribution, ProcessErrors } from './chip/Chip.js';
export { NO_ERRORS } from './chip/Chip.js';
export type { ErrorSource } from './tolerance/errorSources.js';
export { ERROR_SOURCES, withSource } from './tolerance/errorSources.js';
export type { TrialPlan, TrialRefinement } from './tolerance/TrialPlan.js';
export { USUAL_ITERATIONS } from './tolerance/TrialPlan.js';
export type { SampledChip, TrialEngine } from './tolerance/createTrialEngine.js';
export { createTrialEngine } from './tolerance/createTrialEngine.js';
export type { RunTrialsOptions, TrialResults } from './tolerance/runTrials.js';
export { runTrials } from './tolerance/runTrials.js';
export type { Threshold } from './tolerance/thresholds.js';
export { columnOf, countPassed, judgedFigures } from './tolerance/thresholds.js';
export type {
  LadderSearch,
  ToleranceEstimate,
  ToleranceSearch,
  TriedValue,
  YieldCount,
} from './tolerance/findTolerance.js';
export { findFewestBits, findOnLadder, findTolerance } from './tolerance/findTolerance.js';
export type { InfidelityTheory } from './tolerance/smallErrorTheory.js';
export { infidelityTheory, portsTheory, toleranceTheory } from './tolerance/smallErrorTheory.js';

// Statistics of trials
export type { Interval } from './statistics/binomialInterval.js';
export { clopperPearson, wilson } from './statistics/binomialInterval.js';
export type { Quantile } from './statistics/quantiles.js';
export type { Summary, SummaryOptions } from './statistics/summary.js';
export { summarise } from './statistics/summary.js';

// Phase tables
export type { PhaseRow } from './program/PhaseTable.js';
export { formatPhaseCsv, PHASE_TABLE_HEADER, phaseRows } from './program/PhaseTable.js';
export type { TableProvenance } from './program/formatPhaseJson.js';
export { formatPhaseJson } from './program/formatPhaseJson.js';
export type { ReadTable, TableOrigin } from './program/readPhaseTable.js';
export { readPhaseTable } from './program/readPhaseTable.js';
export { settingsFromRows } from './program/settingsFromRows.js';

// Figures
export type { MeshFigureOptions } from './figure/drawMeshFigure.js';
export { drawMeshFigure } from './figure/drawMeshFigure.js';
export type { ValueFigureOptions } from './figure/drawHistogram.js';
export { drawHistogram } from './figure/drawHistogram.js';
export type { CumulativeCurveOptions } from './figure/drawCumulativeCurve.js';
export { drawCumulativeCurve } from './figure/drawCumulativeCurve.js';
export type { SweepCurveOptions, SweepPoint } from './figure/drawSweepCurve.js';
export { drawSweepCurve } from './figure/drawSweepCurve.js';
export type { MeanEstimate } from './figure/meanSigns.js';
export type { BudgetOptions, BudgetRow } from './figure/drawBudget.js';
export { drawBudget } from './figure/drawBudget.js';
export type { ComparisonGroup, ComparisonOptions, ComparisonRow } from './figure/drawComparison.js';
export { drawComparison } from './figure/drawComparison.js';

// Faults in the input
export type { Place } from './errors/InputError.js';
export { InputError } from './errors/InputError.js';

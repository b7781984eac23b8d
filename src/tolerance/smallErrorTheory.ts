import type { Chip, ErrorDistribution, ProcessErrors, SplitterCount } from '../chip/Chip.js';
import type { Layout } from '../mesh/Mesh.js';
import type { TrialPlan } from './TrialPlan.js';

/** What theory says of the mean infidelity, and how far it may be off for reasons other than sampling. */
export interface InfidelityTheory {
  readonly meanInfidelity: number;
  /** Size of what the theory leaves out. */
  readonly uncertainty: number;
  /** Whether the errors are small enough for the theory to mean something: what it leaves out is small beside what it says. */
  readonly holds: boolean;
}

/** Share of the mean infidelity up to which the uncertainty may go. */
const SMALL_ERRORS = 0.3;

/**
 * Mean 1 - F of chips with small independent splitter errors, or null when the theory does not hold: other
 * sources are on, the errors are correlated, or chips are retuned for a target that is not Haar-random.
 *
 * Without retuning E[1-F] = L (1 - c L), L = (2/N) sum of the variances of all splitter angles, for any
 * target on either layout (conventions section 7); c is the Haar mean, so that for one given target a part of
 * c L^2 is uncertain. An error e of the ratio k is one of e / (2 sqrt(k (1 - k))) of the angle, and, since
 * that is no straight line, a little more. The Haar mean of c is known for cells of two splitters; for three
 * all of c L^2 is uncertain. With cells retuned, for splitters of nominally 1/2, the mean square of the matrix
 * error is that of `correctedShare`.
 * @param infidelityWithoutErrors 1 - F of the chip itself; null where it is not one number
 */
export function infidelityTheory(
  plan: TrialPlan,
  infidelityWithoutErrors: number | null,
): InfidelityTheory | null {
  const { chip, errors, retune, target } = plan;
  // Without port shifters the fidelity is a matter of chance.
  if (infidelityWithoutErrors === null || !chip.portShifters) return null;
  if (retune === 'mesh' || retune === 'refine') return null;
  const others = errors.bias !== 0 || errors.biasSigma > 0 || errors.phaseSigma > 0 || errors.bits > 0;
  const correlated = errors.pairCorrelation !== 0 || errors.correlationLength > 0;
  if (others || correlated || errors.lossSigmaDb > 0 || !(errors.sigma > 0 || errors.sigmaAngle > 0))
    return null;
  const { modes, layout } = chip.mesh;
  const { splitters } = chip.style;
  const leading = leadingInfidelity(chip, errors);
  if (leading === null || modes < 2) return null;
  if (retune === 'cell') {
    const nominal = chip.couplingRatios.every((ratio) => ratio === 0.5);
    if (target !== 'haar' || !nominal) return null;
    const variance = leading / (splitters * (modes - 1));
    const corrected = variance ** 2 * correctedShare(modes, splitters);
    // The distribution has a heavy tail and the source allows 15 %.
    const uncertainty = 0.15 * corrected;
    return { meanInfidelity: total(infidelityWithoutErrors, corrected), uncertainty, holds: corrected < 1 };
  }
  const second = nextOrder(layout, modes) * leading ** 2;
  const bent = bentInfidelity(chip, errors);
  const added = leading - second + bent.infidelity;
  const uncertainty =
    leading ** 3 +
    (target === 'haar' && splitters === 2 ? 0.1 : 1) * second +
    2 * infidelityWithoutErrors * leading +
    bent.uncertainty;
  const holds = added > 0 && added < 1 && uncertainty <= SMALL_ERRORS * added;
  return { meanInfidelity: total(infidelityWithoutErrors, added), uncertainty, holds };
}

/**
 * What the correction cell by cell leaves of a Haar target, in units of s^4: for two splitters 2/3 (N^2 - 1) +
 * 4 (N - 1)/N, which grows with the mesh; for three (8/N) sum over k of (N - k) k 2^(1 - k), which does not: at
 * most 32 (check-values, section 2; Hamerly, Bandyopadhyay, Englund, Nat. Commun. 13, 6831 (2022)).
 */
function correctedShare(modes: number, splitters: SplitterCount): number {
  if (splitters === 2) return (2 / 3) * (modes ** 2 - 1) + (4 * (modes - 1)) / modes;
  let sum = 0;
  for (let k = 1; k < modes; k++) sum += (modes - k) * k * 2 ** (1 - k);
  return (8 / modes) * sum;
}

function total(without: number, added: number): number {
  return 1 - (1 - without) * (1 - added);
}

/**
 * L = (2/N) times the sum of the variances of all splitter angles; null where a ratio is 0 or 1, from where
 * an error can go one way only.
 */
function leadingInfidelity(
  { mesh, couplingRatios }: Chip,
  { sigma, sigmaAngle }: ProcessErrors,
): number | null {
  let sum = 0;
  for (const ratio of couplingRatios) {
    const slope = 4 * ratio * (1 - ratio);
    if (!(slope > 0)) return null;
    sum += sigmaAngle ** 2 + sigma ** 2 / slope;
  }
  return (2 / mesh.modes) * sum;
}

/** Fourth moments of an error of variance 1. */
const FOURTH_MOMENT: Readonly<Record<ErrorDistribution, number>> = { normal: 3, uniform: 9 / 5 };

/**
 * What the bent line from ratio to angle adds to L. With g = k (1 - k) and its slope 1 - 2k, Taylor's series
 * of a(k) = asin(sqrt k) makes the mean square of the angle's error (s^2/4g) (1 + q), q = m s^2 (1/(3g) + 5
 * (1 - 2k)^2/(16 g^2)), m the fourth moment of e/s; 4 s^2 for normal errors of a ratio of 1/2. Uncertain are
 * the next term, about 3 q^2, and the mean of the angle's error, which splitters have in common: (1 - 2k)^2
 * s^2/(16 g^2) of the variance, for at most N splitters that act together.
 */
function bentInfidelity(
  { mesh, couplingRatios }: Chip,
  { sigma, distribution }: ProcessErrors,
): { readonly infidelity: number; readonly uncertainty: number } {
  let infidelity = 0;
  let uncertainty = 0;
  for (const ratio of couplingRatios) {
    const g = ratio * (1 - ratio);
    const common = ((1 - 2 * ratio) * sigma) ** 2 / (16 * g ** 2);
    const relative = FOURTH_MOMENT[distribution] * (sigma ** 2 / (3 * g) + 5 * common);
    const variance = sigma ** 2 / (4 * g);
    infidelity += variance * relative;
    uncertainty += variance * (3 * relative ** 2 + mesh.modes * common);
  }
  return { infidelity: (2 / mesh.modes) * infidelity, uncertainty: (2 / mesh.modes) * uncertainty };
}

/**
 * Haar means of c by [N, triangular, rectangular]; check-values section 2, exact superoperator averages; 1/2
 * for large N.
 */
const NEXT_ORDER = [
  [2, 5 / 6, 5 / 6],
  [3, 0.65, 0.65],
  [4, 0.59, 0.58],
  [8, 0.549, 0.523],
  [16, 0.54, 0.507],
  [Infinity, 0.5, 0.5],
] as const;

/** c for N ports, interpolated in 1/N. */
function nextOrder(layout: Layout, modes: number): number {
  const column = layout === 'triangular' ? 1 : 2;
  const above = NEXT_ORDER.findIndex(([n]) => n >= modes);
  const [n1, ...low] = NEXT_ORDER[Math.max(0, above - 1)]!;
  const [n2, ...high] = NEXT_ORDER[above]!;
  if (n1 === n2 || modes === n2) return high[column - 1]!;
  const share = (1 / n1 - 1 / modes) / (1 / n1 - 1 / n2);
  return low[column - 1]! + share * (high[column - 1]! - low[column - 1]!);
}

/**
 * Relative scatter of 1 - F from chip to chip: about 2.2/N (0.53, 0.28, 0.145 for N = 4, 8, 16; check-values
 * section 2).
 */
const CHIP_SCATTER = 2.2;

/**
 * The closed-form estimate of the largest spread of a source for which the share `yieldWanted` of chips keeps
 * the fidelity: the mean infidelity of a chip, with its scatter from chip to chip taken as normal, stays
 * below 1 - limit. Null for other sources, retuned chips, other figures, or cells of three splitters, whose
 * scatter is not known.
 * @param quantile the normal quantile of the yield wanted
 * @param infidelityWithoutErrors 1 - F of the chip itself; null where it is not one number
 */
export function toleranceTheory(
  plan: TrialPlan,
  source: string,
  fidelityLimit: number,
  quantile: number,
  infidelityWithoutErrors: number | null,
): number | null {
  const { chip, errors, retune } = plan;
  if (infidelityWithoutErrors === null || chip.style.splitters !== 2) return null;
  if (retune !== 'none' || (source !== 'sigma' && source !== 'sigmaAngle') || chip.mesh.modes < 2)
    return null;
  const unit = leadingInfidelity(chip, { ...errors, sigma: 0, sigmaAngle: 0, [source]: 1 });
  const others = infidelityTheory({ ...plan, errors: { ...errors, [source]: 1e-9 } }, 0) === null;
  const allowed = 1 - fidelityLimit - infidelityWithoutErrors;
  if (unit === null || others || !(allowed > 0)) return null;
  const factor = 1 + (CHIP_SCATTER / chip.mesh.modes) * quantile;
  return factor > 0 ? Math.sqrt(allowed / (unit * factor)) : null;
}

/** Largest 1 - F of a chip that counts as flawless. */
const FLAWLESS = 1e-9;

/**
 * The same for the number of ports N, not rounded: L grows as N - 1, and the scatter falls as 1/N, so that u (N -
 * 1) (1 + z 2.2/N) = 1 - limit, u the mean infidelity by the port and z the quantile. Null for chips that are
 * not flawless themselves, not alike in all splitters, or with three of them in a cell.
 * @param plan of chips with any number of ports from 2 on
 */
export function portsTheory(
  plan: TrialPlan,
  fidelityLimit: number,
  quantile: number,
  infidelityWithoutErrors: number | null,
): number | null {
  const { chip, retune } = plan;
  if (!(infidelityWithoutErrors !== null && infidelityWithoutErrors < FLAWLESS) || retune !== 'none')
    return null;
  if (chip.style.splitters !== 2) return null;
  const leading = leadingInfidelity(chip, plan.errors);
  const alike = chip.couplingRatios.every((ratio) => ratio === chip.couplingRatios[0]);
  if (leading === null || !alike || infidelityTheory(plan, 0) === null) return null;
  const allowedPorts = ((1 - fidelityLimit) * (chip.mesh.modes - 1)) / leading;
  const scatter = CHIP_SCATTER * quantile;
  const half = (allowedPorts + 1 - scatter) / 2;
  const square = half ** 2 + scatter;
  return square >= 0 && half + Math.sqrt(square) >= 2 ? half + Math.sqrt(square) : null;
}

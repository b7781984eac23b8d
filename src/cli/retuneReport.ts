import type { Chip } from '../chip/Chip.js';
import type { CellMargin } from '../program/cellMargins.js';
import type { CostDescription } from '../merit/createCost.js';
import { judgedFigure } from '../merit/judgedFidelity.js';
import type { PortAssignment } from '../program/reassignPorts.js';
import type { AngleUnit } from '../units/angle.js';
import { counted, shortNumber, shownAngle } from './messages.js';
import { MERIT_NAMES, shownMerit } from './reportParts.js';
import type { ReassignedTarget, RetunedTarget } from './retuneTarget.js';
import { textTable } from './textTable.js';

/** Meshes with more ports have their reach summed up in the report, not listed cell by cell. */
const LARGEST_REACH_LIST = 64;

const numbers = (ports: readonly number[]): number[] => ports.map((port) => port + 1);
const isMoved = (ports: readonly number[]): boolean => ports.some((to, port) => to !== port);

/** The blocks of a report that say how the phases were found; ports, cells and shifters count from 1. */
export function retuningBlocks(chip: Chip, found: RetunedTarget): Record<string, unknown> {
  const { margins, retunings, refinement, refined, stuck, meritWithoutStuck } = found;
  const all = Array.from({ length: chip.mesh.modes }, (_, port) => port);
  return {
    retunings,
    ...(refinement && refined
      ? {
          refinement: {
            figure: refined.figure,
            inputs: numbers(refined.inputs ?? all),
            outputs: numbers(refined.outputs ?? all),
            before: refinement.figureBefore,
            after: refinement.figure,
            iterations: refinement.iterations,
            stopped: refinement.stopped,
            starts: refinement.starts,
            ...(found.figureWithoutStuck === null ? {} : { withoutStuck: found.figureWithoutStuck }),
          },
        }
      : {}),
    leastMargin: leastMarginBlock(margins),
    reach: chip.mesh.modes > LARGEST_REACH_LIST ? [] : margins.map(marginBlock),
    stuckShifters: stuck.map(({ shifterIndex, phaseRad }) => ({ shifter: shifterIndex + 1, phaseRad })),
    ...(meritWithoutStuck ? { meritWithoutStuck } : {}),
  };
}

function marginBlock({ cellIndex, wanted, low, high, margin }: CellMargin): Record<string, unknown> {
  return { cell: cellIndex + 1, wanted, reach: [low, high], margin };
}

function leastMarginBlock(margins: readonly CellMargin[]): Record<string, unknown> | null {
  const least = leastMargin(margins);
  return least && { cell: least.cellIndex + 1, margin: least.margin };
}

function leastMargin(margins: readonly CellMargin[]): CellMargin | null {
  let least: CellMargin | null = null;
  for (const one of margins) if (least === null || one.margin < least.margin) least = one;
  return least;
}

/** The block `assignment` of a report: the chip's port for each port of the target. */
export function reassignmentBlock({ assignment, gain }: ReassignedTarget): Record<string, unknown> {
  if (gain === null) return {};
  const { outputs, inputs } = assignment;
  return { assignment: { outputs: numbers(outputs), inputs: numbers(inputs), ...gain } };
}

/** What is added to a target's source once its ports stand at others of the chip; empty when none does. */
export function assignmentText({ outputs, inputs }: PortAssignment): string {
  const sides = [
    ...(isMoved(outputs) ? [`outputs 1, 2, ... at ${numbers(outputs).join(', ')}`] : []),
    ...(isMoved(inputs) ? [`inputs 1, 2, ... at ${numbers(inputs).join(', ')}`] : []),
  ];
  return sides.length === 0 ? '' : `, ${sides.join(', ')}`;
}

/** How the phases were found, as paragraphs of text. */
export function retuningText(
  chip: Chip,
  found: RetunedTarget,
  { assignment, gain }: ReassignedTarget,
  unit: AngleUnit,
): string[] {
  const { retunings, refinement, refined, stuck, meritWithoutStuck, merit, margins } = found;
  const paragraphs: string[] = [];
  if (retunings.length > 2) {
    const rows = retunings.map((one) => [
      one.retune,
      shownMerit(one.merit.fidelity),
      shownMerit(one.merit.portPhaseFreeFidelity),
      shownMerit(one.merit.powerDistance),
    ]);
    paragraphs.push(textTable(['retuning', 'fidelity', 'port-phase-free', 'power distance'], rows));
  }
  if (refinement && refined) {
    const where = portsText(refined);
    const starts = refinement.starts > 1 ? `, the best of ${refinement.starts} starts` : '';
    paragraphs.push(
      `refined ${MERIT_NAMES[refined.figure]}${where}: from ${shownMerit(refinement.figureBefore)} to ` +
        `${shownMerit(refinement.figure)} in ${counted(refinement.iterations, 'step')}${starts} (${STOPS[refinement.stopped]})` +
        (where === '' ? '' : '; all other figures are over all ports'),
    );
  }
  if (gain !== null) {
    const text = assignmentText(assignment);
    paragraphs.push(
      text === ''
        ? 'no exchange of two ports makes the chip better: all stay where they are'
        : `ports of the target at ports of the chip${text.slice(1)}: from ${shownMerit(gain.before)} to ` +
            `${shownMerit(gain.after)} before any refinement`,
    );
  }
  if (meritWithoutStuck) {
    const list = stuck
      .slice(0, 5)
      .map(({ shifterIndex, phaseRad }) => `${shifterIndex + 1} at ${shownAngle(phaseRad, unit)}`);
    const more = stuck.length > 5 ? ` and ${stuck.length - 5} more` : '';
    const key = refined?.figure ?? judgedFigure(chip);
    const figure = refinement?.figure ?? merit[key];
    paragraphs.push(
      `stuck: ${stuck.length === 1 ? 'shifter' : 'shifters'} ${list.join(', ')}${more}; ` +
        `${MERIT_NAMES[key]}${refined ? portsText(refined) : ''} ${shownMerit(figure)}, without that ` +
        shownMerit(found.figureWithoutStuck ?? meritWithoutStuck[key]),
    );
  }
  const least = leastMargin(margins);
  if (least !== null && retunings[0]!.retune === 'none') {
    paragraphs.push(
      `reach: cell ${least.cellIndex + 1} has the least margin, a bar power of ${shortNumber(least.margin)}`,
    );
  }
  return paragraphs;
}

/** The chosen ports in words, as the chip has them; empty for all. */
function portsText({ inputs, outputs }: CostDescription): string {
  const list = (noun: string, ports: readonly number[]): string =>
    `the chip's ${noun}${ports.length === 1 ? '' : 's'} ${numbers(ports).join(', ')}`;
  const ports = [
    ...(inputs ? [`light in ${list('input', inputs)}`] : []),
    ...(outputs ? [list('output', outputs)] : []),
  ];
  return ports.length === 0 ? '' : ` for ${ports.join(' and ')}`;
}

/**
 * The caption of a figure, whose last line is the fidelity: after a refinement for chosen ports it says that this is
 * over all ports, and what was refined.
 */
export function refinementCaption(
  { refinement, refined }: RetunedTarget,
  lines: readonly string[],
): readonly string[] {
  if (!refinement || !refined || portsText(refined) === '') return lines;
  return [
    ...lines.slice(0, -1),
    `refined${portsText(refined)}: ${MERIT_NAMES[refined.figure]} ${shownMerit(refinement.figure)}`,
    `over all ports: ${lines.at(-1)}`,
  ];
}

const STOPS = {
  gradient: 'no step gains anything',
  stall: 'little is gained any more',
  iterations: 'all steps granted are done',
  time: 'the time granted is over',
  interrupted: 'interrupted',
} as const;

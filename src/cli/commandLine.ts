import { Command, CommanderError } from 'commander';
import { InputError } from '../errors/InputError.js';
import { nearestName } from '../errors/nearestName.js';
import { printableText } from '../figure/printableText.js';
import { packageVersion } from '../files/version.js';
import { addChipCommand } from './chip.js';
import { addCompareCommand } from './compare.js';
import { errorColours, withoutControls } from './console.js';
import { addFigureCommand } from './figure.js';
import { addPhasesCommand } from './phases.js';
import { addTargetCommand } from './target.js';
import { addToleranceCommand } from './tolerance.js';
import { addVerifyCommand } from './verify.js';
import { addYieldCommand } from './yield.js';

/** Exit codes of the program. */
export const EXIT = { done: 0, notMet: 1, input: 2, internal: 3 } as const;

/**
 * Runs the program with its arguments (without the names of node and of the script). Prints results, messages
 * and errors.
 * @returns the exit code: 0 done, 1 done and a --require not met, 2 input or usage at fault, 3 internal fault
 */
export async function runCommandLine(args: readonly string[]): Promise<number> {
  let exitCode: number = EXIT.done;
  const program = buildProgram((code) => (exitCode = code));
  if (args.length === 0) {
    program.configureOutput({ writeErr: (text) => process.stderr.write(text) }).outputHelp({ error: true });
    return EXIT.input;
  }
  try {
    await program.parseAsync([...args], { from: 'user' });
    return exitCode;
  } catch (error) {
    return reportError(error, args, program);
  }
}

function buildProgram(setExitCode: (code: number) => void): Command {
  const program = new Command('phasewright')
    .description('Phases, fidelity and figures for programmable photonic chips.')
    .version(packageVersion(), '--version', 'print the version')
    .helpOption('-h, --help', 'print help')
    .helpCommand('help [command]', 'print help for a command')
    .exitOverride()
    .configureOutput({ writeErr: () => undefined })
    .addHelpText(
      'after',
      `
Examples:
  phasewright phases "dft(4)"                       phases of an ideal chip for a 4-port Fourier transform
  phasewright phases target.npy --chip my.chip.json phases of your own chip
  phasewright help phases                           all options of a command

Exit codes: 0 done, 1 a --require was not met, 2 input or usage at fault, 3 internal fault, 130 interrupted.`,
    );
  addPhasesCommand(program, setExitCode);
  addVerifyCommand(program, setExitCode);
  addYieldCommand(program, setExitCode);
  addToleranceCommand(program, setExitCode);
  addCompareCommand(program, setExitCode);
  addTargetCommand(program, setExitCode);
  addChipCommand(program);
  addFigureCommand(program);
  for (const command of program.commands) {
    command.exitOverride().configureOutput({ writeErr: () => undefined });
  }
  return program;
}

/** Prints an error: one line that says what is wrong and where, one that says how to mend it. */
function reportError(error: unknown, args: readonly string[], program: Command): number {
  if (error instanceof CommanderError && error.exitCode === 0) return EXIT.done;
  const { what, remedy, code } = inWords(error, args, program);
  const colours = errorColours();
  process.stderr.write(`${colours.red('error')}: ${withoutControls(what)}\n${withoutControls(remedy)}\n`);
  if (args.includes('--debug') && error instanceof Error) process.stderr.write(`${error.stack ?? ''}\n`);
  return code;
}

interface ErrorInWords {
  readonly what: string;
  readonly remedy: string;
  readonly code: number;
}

function inWords(error: unknown, args: readonly string[], program: Command): ErrorInWords {
  if (error instanceof InputError) return { what: error.message, remedy: error.remedy, code: EXIT.input };
  if (error instanceof CommanderError) return { ...usageInWords(error, args, program), code: EXIT.input };
  const message = error instanceof Error ? error.message : String(error);
  return {
    what: `internal fault: ${message.split('\n')[0]!}`,
    remedy: 'This is a mistake in phasewright: please report it, with what --debug prints.',
    code: EXIT.internal,
  };
}

function usageInWords(
  error: CommanderError,
  args: readonly string[],
  program: Command,
): { what: string; remedy: string } {
  if (error.code === 'commander.help') return helpUnknown(args, program);
  const [first = '', second] = error.message.replace(/^error: /, '').split('\n');
  const suggestion = second === undefined ? undefined : /Did you mean (?:one of )?(.*)\?\)/.exec(second)?.[1];
  const command = args.find((argument) => !argument.startsWith('-'));
  const help = `See phasewright help${error.code === 'commander.unknownCommand' || !command ? '' : ` ${command}`}.`;
  if (error.code === 'commander.unknownOption') {
    const option = /'(.*)'/.exec(first)?.[1] ?? '';
    if (/^-[^-]/.test(option) && option !== '-h') {
      return {
        what: first,
        remedy:
          `If ${option} is a formula, put -- before it, behind all options: ` +
          `phasewright ${command ?? 'phases'} -- "${option}"`,
      };
    }
  }
  if (error.code === 'commander.excessArguments') {
    return {
      what: first.replace(/\.$/, ''),
      remedy: 'Put quotes around a formula or name with blanks in it, and options before --.',
    };
  }
  return { what: first, remedy: suggestion === undefined ? help : `Did you mean ${suggestion}?` };
}

/** `help` was asked for something that is no command. */
function helpUnknown(args: readonly string[], program: Command): { what: string; remedy: string } {
  const asked = args.filter((argument) => !argument.startsWith('-'))[1] ?? '';
  const known = program.commands.map((command) => command.name());
  const near = nearestName(asked, known);
  return {
    what: `unknown command '${printableText(asked)}'`,
    remedy: near === undefined ? `Commands are ${known.join(', ')}.` : `Did you mean ${near}?`,
  };
}

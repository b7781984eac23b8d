/**
 * Runs the built program many times in one process, which spares its start: reads a list of {folder, args} as
 * JSON from standard input, and prints a list of {code, stdout, stderr}. Run by `runMany`.
 */
import { text } from 'node:stream/consumers';

interface Call {
  readonly folder: string;
  readonly args: readonly string[];
}
interface CommandLine {
  readonly runCommandLine: (args: readonly string[]) => Promise<number>;
}

const [commandLine] = process.argv.slice(2);
const { runCommandLine } = (await import(commandLine!)) as CommandLine;
const calls = JSON.parse(await text(process.stdin)) as readonly Call[];
const write = {
  stdout: process.stdout.write.bind(process.stdout),
  stderr: process.stderr.write.bind(process.stderr),
};
const results = [];
for (const { folder, args } of calls) {
  const printed = { stdout: '', stderr: '' };
  for (const name of ['stdout', 'stderr'] as const) {
    process[name].write = (chunk: string | Uint8Array): boolean => {
      printed[name] += typeof chunk === 'string' ? chunk : Buffer.from(chunk).toString();
      return true;
    };
  }
  process.chdir(folder);
  results.push({ code: await runCommandLine(args), ...printed });
}
write.stdout(JSON.stringify(results));

import type { NamedFile } from '../files/writeResults.js';
import { REPORT_FILE, writeResults } from '../files/writeResults.js';
import type { OutputOptions } from './commandOptions.js';
import type { Console } from './console.js';
import type { Report } from './reportParts.js';

/** What a command has found, ready to be written and shown. */
export interface Outcome {
  readonly folder: string;
  /** Contents by file name, without the report. */
  readonly files: ReadonlyMap<string, string | Uint8Array>;
  /** The report without `files`, which are added here. */
  readonly report: Readonly<Record<string, unknown>> & { readonly runId: string; readonly command: string };
  /** The file that --to names. */
  readonly named?: NamedFile | undefined;
  /** Prints the result in words. */
  readonly show: () => void;
}

/** Writes the results, the report last; then shows them, as words or as the report when it is asked for. */
export async function finish(console: Console, options: OutputOptions, outcome: Outcome): Promise<void> {
  const { folder, files, report, named, show } = outcome;
  const names = [...files.keys(), REPORT_FILE];
  const whole: Report = { ...report, files: names };
  const text = `${JSON.stringify(whole, null, 2)}\n`;
  await writeResults({
    folder,
    files,
    report: text,
    runId: report.runId,
    command: report.command,
    force: options.force === true,
    replacesLoneReport: files.size === 0 && options.out === undefined,
    ...(named === undefined ? {} : { named }),
  });
  if (options.json === true) process.stdout.write(text);
  show();
  console.message(`written to ${folder}: ${shownNames(names)}`);
  if (named !== undefined) console.message(`written to ${named.path}`);
}

function shownNames(names: readonly string[]): string {
  return names.length <= 6
    ? names.join(', ')
    : `${names.slice(0, 3).join(', ')}, ... ${names.slice(-2).join(', ')} (${names.length} files)`;
}

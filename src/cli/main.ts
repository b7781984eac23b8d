#!/usr/bin/env node
import { runCommandLine } from './commandLine.js';

// A reader that has seen enough (head, less) closes the pipe: that is no error, and the exit code stays what
// it would be.
for (const stream of [process.stdout, process.stderr]) {
  stream.on('error', (error: NodeJS.ErrnoException) => {
    if (error.code !== 'EPIPE') throw error;
  });
}

process.exitCode = await runCommandLine(process.argv.slice(2));

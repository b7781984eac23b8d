#!/usr/bin/env node
import { runCommandLine } from './commandLine.js';

// A reader that has seen enough (head, less) closes the pipe: that ends the program, and is no error.
process.stdout.on('error', (error: NodeJS.ErrnoException) => {
  if (error.code === 'EPIPE') process.exit(0);
  throw error;
});

process.exitCode = await runCommandLine(process.argv.slice(2));

#!/usr/bin/env node
import { runCommandLine } from './commandLine.ts';
import { processTerminal } from './commands/terminal.ts';

// The program as it is installed: one command line, run in a process of its own.

// A reader that has gone away (`| head`) ends the output, not the work.
for (const stream of [process.stdout, process.stderr]) stream.on('error', () => {});
process.exitCode = await runCommandLine(process.argv.slice(2), processTerminal);

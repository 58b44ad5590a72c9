import { execFile } from 'node:child_process';
import { join } from 'node:path';
import { runCommandLine } from '../../daemon/commandLine.ts';
import { keptTerminal } from './keptTerminal.ts';
import { ROOT } from './sourceTree.ts';

/** The program as it is installed: `npm test` builds it first. */
export const CLI = join(ROOT, 'dist', 'daemon', 'cli.js');

export interface Finished {
  readonly code: number;
  readonly stdout: string;
  readonly stderr: string;
}

export interface Surroundings {
  /** What is typed or piped into it. */
  readonly input?: string;
  readonly environment?: NodeJS.ProcessEnv;
}

/** Runs one command of the installed program to its end. */
export function runInstalled(
  args: readonly string[],
  { input = '', environment = {} }: Surroundings = {},
): Promise<Finished> {
  return new Promise((resolve) => {
    const options = { env: { ...process.env, ...environment }, maxBuffer: 64 * 1024 * 1024 };
    const child = execFile(process.execPath, [CLI, ...args], options, (_error, stdout, stderr) =>
      resolve({ code: child.exitCode ?? -1, stdout, stderr }),
    );
    child.stdin?.end(input);
  });
}

/** Runs one command line in this process: all that the installed program does, but for the second that its start takes. */
export async function runSpinvigil(args: readonly string[]): Promise<Finished> {
  const terminal = keptTerminal();
  const code = await runCommandLine(args, terminal);
  return { code, stdout: terminal.stdout(), stderr: terminal.stderr() };
}

/** What a command prints with `--json`; throws with its complaint when it fails. */
export async function spinvigilJson<T>(args: readonly string[]): Promise<T> {
  const { code, stdout, stderr } = await runSpinvigil([...args, '--json']);
  if (code !== 0) throw new Error(`spinvigil ${args.join(' ')} ended with ${code}: ${stderr}`);
  return JSON.parse(stdout) as T;
}

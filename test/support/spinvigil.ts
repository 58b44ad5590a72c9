import { execFile } from 'node:child_process';
import { join } from 'node:path';
import { ROOT } from './sourceTree.ts';

/** The program as it is installed: `npm test` builds it first. */
export const CLI = join(ROOT, 'dist', 'daemon', 'cli.js');

export interface Finished {
  readonly code: number;
  readonly stdout: string;
  readonly stderr: string;
}

/** Runs one command to its end. */
export function runSpinvigil(args: readonly string[]): Promise<Finished> {
  return new Promise((resolve) => {
    const options = { maxBuffer: 64 * 1024 * 1024 };
    const child = execFile(process.execPath, [CLI, ...args], options, (_error, stdout, stderr) =>
      resolve({ code: child.exitCode ?? -1, stdout, stderr }),
    );
  });
}

/** What a command prints with `--json`; throws with its complaint when it fails. */
export async function spinvigilJson<T>(args: readonly string[]): Promise<T> {
  const { code, stdout, stderr } = await runSpinvigil([...args, '--json']);
  if (code !== 0) throw new Error(`spinvigil ${args.join(' ')} ended with ${code}: ${stderr}`);
  return JSON.parse(stdout) as T;
}

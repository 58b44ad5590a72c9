import { spawn } from 'node:child_process';
import { CLI } from './spinvigil.ts';
import { within } from './within.ts';

/** A program that runs until it is told to stop, or dies by itself. */
export interface RunningProgram {
  readonly pid: number;
  /** The signal or the exit code it ended with. */
  readonly ended: Promise<string>;
  hasEnded(): boolean;
  stdout(): string;
  stderr(): string;
  signal(signal: NodeJS.Signals): void;
}

export function startSpinvigil(args: readonly string[], environment: NodeJS.ProcessEnv = {}): RunningProgram {
  const child = spawn(process.execPath, [CLI, ...args], {
    env: { ...process.env, ...environment },
    stdio: ['ignore', 'pipe', 'pipe'],
  });
  const { pid } = child;
  if (pid === undefined) throw new Error('the program could not be started');
  let stdout = '';
  let stderr = '';
  let hasEnded = false;
  child.stdout.on('data', (chunk) => (stdout += chunk));
  child.stderr.on('data', (chunk) => (stderr += chunk));
  const ended = new Promise<string>((resolve) =>
    child.on('exit', (code, signal) => {
      hasEnded = true;
      resolve(signal ?? String(code));
    }),
  );
  return {
    pid,
    ended,
    hasEnded: () => hasEnded,
    stdout: () => stdout,
    stderr: () => stderr,
    signal: (signal) => void child.kill(signal),
  };
}

/** What vitest's `onTestFinished` takes. */
export type WhenFinished = (close: () => Promise<void>) => void;

const PATIENCE_S = 60;

/** The watch of an observatory, once it has said that it watches; killed when the test has ended, if it runs still. */
export async function startWatch(
  whenFinished: WhenFinished,
  configFile: string,
  environment: NodeJS.ProcessEnv = {},
): Promise<RunningProgram> {
  const program = startSpinvigil(['watch', '--config', configFile], environment);
  whenFinished(async () => {
    program.signal('SIGKILL');
    await program.ended;
  });
  await within(PATIENCE_S, () => program.hasEnded() || program.stdout().includes('\n'));
  if (program.hasEnded()) throw new Error(`the watch ended by itself: ${program.stderr()}`);
  return program;
}

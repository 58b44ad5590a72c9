import { spawn } from 'node:child_process';
import { setTimeout as pause } from 'node:timers/promises';
import { CLI } from './spinvigil.ts';

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

/** Looks until `what` holds or the time is over; answers whether it came to hold. */
export async function within(seconds: number, what: () => boolean | Promise<boolean>): Promise<boolean> {
  const until = Date.now() + seconds * 1000;
  while (Date.now() < until) {
    if (await what()) return true;
    await pause(50);
  }
  return false;
}

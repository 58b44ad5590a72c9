import { type ChildProcess, spawn } from 'node:child_process';
import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { setTimeout as pause } from 'node:timers/promises';
import { openStore, type Store } from '../../daemon/store/index.ts';
import type { TestObservatory } from './observatory.ts';
import { ROOT } from './sourceTree.ts';

/** The daemon from its sources in a process of its own, asked over its page and beside it as a reader of the record: for the studies of load. */
export interface WatchProcess {
  readonly url: string;
  /** Until it said where its page is. */
  readonly startedInS: number;
  /** The process and those that it started. */
  residentMb(): number;
  stop(): Promise<void>;
}

export async function startWatch({ configFile }: Pick<TestObservatory, 'configFile'>): Promise<WatchProcess> {
  const begunMs = performance.now();
  const child: ChildProcess = spawn(
    process.execPath,
    ['--import', 'tsx', join(ROOT, 'daemon/cli.ts'), 'watch', '--config', configFile],
    { cwd: ROOT, stdio: ['ignore', 'pipe', 'ignore'] },
  );
  let said = '';
  child.stdout?.on('data', (chunk) => (said += chunk));
  const ended = new Promise<void>((resolve) => child.once('exit', () => resolve()));
  for (;;) {
    const url = /review page: (\S+)/.exec(said)?.[1];
    if (url !== undefined) {
      return {
        url: url.replace(/\/$/, ''),
        startedInS: Math.round((performance.now() - begunMs) / 100) / 10,
        residentMb: () => Math.round([child.pid!, ...childrenOf(child.pid!)].reduce((sum, pid) => sum + rssMb(pid), 0)),
        async stop() {
          child.kill('SIGTERM');
          await ended;
        },
      };
    }
    if (child.exitCode !== null) throw new Error(`the daemon ended with ${child.exitCode}`);
    await pause(50);
  }
}

function childrenOf(pid: number): number[] {
  const listed = readFileSync(`/proc/${pid}/task/${pid}/children`, 'utf8').trim();
  return listed === '' ? [] : listed.split(' ').map(Number);
}

function rssMb(pid: number): number {
  return Number(/VmRSS:\s+(\d+)/.exec(readFileSync(`/proc/${pid}/status`, 'utf8'))?.[1] ?? 0) / 1000;
}

/** Milliseconds until the whole answer was there. */
export async function ask(url: string): Promise<number> {
  const begunMs = performance.now();
  // A connection of its own: one that is kept may be closed by the page just when it is used again.
  const answer = await fetch(url, { headers: { Connection: 'close' } });
  await answer.arrayBuffer();
  if (!answer.ok) throw new Error(`${url}: ${answer.status}`);
  return performance.now() - begunMs;
}

export function asReader<Result>(
  { stateFolder }: Pick<TestObservatory, 'stateFolder'>,
  look: (store: Store) => Result,
): Result {
  const opened = openStore(stateFolder, { mode: 'reader' });
  if (!opened.ok) throw new Error(opened.failure.message);
  try {
    return look(opened.store);
  } finally {
    opened.store.close();
  }
}

export function spread(ms: readonly number[]) {
  const sorted = [...ms].sort((a, b) => a - b);
  const at = (share: number) => Math.round(sorted[Math.min(sorted.length - 1, Math.floor(share * sorted.length))] ?? 0);
  const within = sorted.filter((one) => one < 1000).length;
  return { asked: sorted.length, medianMs: at(0.5), ms99: at(0.99), longestMs: at(1), withinASecond: within };
}

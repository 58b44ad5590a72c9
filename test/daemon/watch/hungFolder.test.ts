import { mkdirSync, mkdtempSync, readdirSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterEach, beforeEach, describe, expect, it, vi } from 'vitest';
import { systemClock } from '../../../daemon/clock.ts';
import type { WatchProblem } from '../../../daemon/watch/feedLook.ts';
import type { TakenFile } from '../../../daemon/watch/feedMemory.ts';
import { helperEyes } from '../../../daemon/watch/helperEyes.ts';
import { createWatcher, type Watcher } from '../../../daemon/watch/watcher.ts';

// A stopped process (SIGSTOP) stands for one that waits in the system for a server that does not answer.

const TIMEOUT_MS = 120_000;
const PATIENCE_MS = 8000;
const until = (check: () => void) => vi.waitFor(check, { timeout: TIMEOUT_MS / 2, interval: 50 });
let folder: string;
let watcher: Watcher | null = null;
beforeEach(() => {
  folder = mkdtempSync(join(tmpdir(), 'spinvigil-hung-'));
});
afterEach(async () => {
  await watcher?.stop();
  rmSync(folder, { recursive: true });
});

/** Our own processes that look at folders. */
function helpers(): number[] {
  return readdirSync(`/proc/${process.pid}/task`)
    .flatMap((task) => readFileSync(`/proc/${process.pid}/task/${task}/children`, 'utf8').trim().split(' '))
    .filter((pid) => pid !== '' && readFileSync(`/proc/${pid}/cmdline`, 'utf8').includes('folderHelper'))
    .map(Number);
}

function start(names: readonly string[], patienceMs = PATIENCE_MS) {
  const handed: string[] = [];
  const problems: WatchProblem[] = [];
  const ended: WatchProblem[] = [];
  const taken = new Map<string, TakenFile>();
  for (const name of names) mkdirSync(join(folder, name));
  const settings = { layout: 'csv', columns: null, recursive: false, pollSeconds: 0.3, polling: true } as const;
  watcher = createWatcher({
    feeds: names.map((name) => ({ name, folder: join(folder, name), ...settings, expectEveryHours: null })),
    openEyes: helperEyes(patienceMs),
    recall: (feed, { path }) => taken.get(`${feed}/${path}`) ?? null,
    async onSettled({ feed, path, stamp }, bytes) {
      handed.push(`${feed}/${path}: ${bytes}`);
      taken.set(`${feed}/${path}`, stamp);
      return 'taken';
    },
    onProblem: (problem) => problems.push(problem),
    onProblemEnded: (problem) => ended.push(problem),
    clock: systemClock,
    settleMs: 100,
  });
  return { handed, problems, ended };
}

describe('a folder on a file system that hangs', { timeout: TIMEOUT_MS }, () => {
  it('A36 holds up its own feed alone, which goes on by itself afterwards', async () => {
    const { handed, problems, ended } = start(['near', 'far']);
    writeFileSync(join(folder, 'far', 'a.csv'), 'one');
    await until(() => expect(handed).toEqual(['far/a.csv: one']));

    const [near = 0, far = 0] = helpers();
    expect([near, far]).not.toContain(0);
    process.kill(far, 'SIGSTOP');
    for (const feed of ['near', 'far']) writeFileSync(join(folder, feed, 'b.csv'), 'two');
    await until(() => expect(handed).toContain('near/b.csv: two'));
    await until(() => expect(problems).toMatchObject([{ feed: 'far', kind: 'no answer', path: null }]));
    await until(() => expect(handed).toContain('far/b.csv: two'));
    expect(ended).toMatchObject([{ feed: 'far', kind: 'no answer' }]);
    expect(helpers()).not.toContain(far);
    expect(helpers()).toHaveLength(2);
  });

  it('A36 does not keep the watch from stopping', async () => {
    const { handed } = start(['far'], 10 * TIMEOUT_MS);
    writeFileSync(join(folder, 'far', 'a.csv'), 'one');
    await until(() => expect(handed).toHaveLength(1));
    for (const pid of helpers()) process.kill(pid, 'SIGSTOP');
    await watcher?.stop();
    await until(() => expect(helpers()).toEqual([]));
  });
});

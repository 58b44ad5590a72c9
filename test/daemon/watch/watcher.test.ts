import { EventEmitter } from 'node:events';
import { mkdirSync, readdirSync, rmSync, statSync, symlinkSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { afterEach, describe, expect, it, vi } from 'vitest';
import { systemClock } from '../../../daemon/clock.ts';
import type { Feed } from '../../../daemon/config/configuration.ts';
import type { WatchProblem } from '../../../daemon/watch/feedLook.ts';
import type { TakenFile } from '../../../daemon/watch/feedMemory.ts';
import type { Watch } from '../../../daemon/watch/notices.ts';
import { createWatcher, type Watcher, type WatcherOptions } from '../../../daemon/watch/watcher.ts';
import { useTemporaryFolders } from '../../support/temporaryFolder.ts';

const newFolder = useTemporaryFolders();
const running: Watcher[] = [];
afterEach(async () => {
  await Promise.all(running.splice(0).map((watcher) => watcher.stop()));
});

function start(folder: string, options: Partial<WatcherOptions> = {}, feed: Partial<Feed> = {}) {
  const handed: string[] = [];
  const problems: WatchProblem[] = [];
  const ended: WatchProblem[] = [];
  const taken = new Map<string, TakenFile>();
  const watcher = createWatcher({
    feeds: [
      {
        name: 'feed',
        folder,
        layout: 'csv',
        columns: null,
        recursive: false,
        pollSeconds: 3600,
        polling: false,
        expectEveryHours: null,
        ...feed,
      },
    ],
    recall: (_feed, { path }) => taken.get(path) ?? null,
    onSettled: async (file, bytes) => {
      handed.push(`${file.path}: ${bytes}`);
      taken.set(file.path, file.stamp);
      return 'taken';
    },
    onProblem: (problem) => problems.push(problem),
    onProblemEnded: (problem) => ended.push(problem),
    clock: systemClock,
    settleMs: 100,
    ...options,
  });
  running.push(watcher);
  return { watcher, handed, problems, ended };
}

const until = (check: () => void) => vi.waitFor(check, { timeout: 20_000, interval: 20 });

describe('the watcher', () => {
  it('hands over what stands there at the start and what comes, woken by notices alone', async () => {
    const folder = newFolder();
    writeFileSync(join(folder, 'a.csv'), 'one');
    const { handed } = start(folder);
    await until(() => expect(handed).toEqual(['a.csv: one']));
    writeFileSync(join(folder, 'b.csv'), 'two');
    await until(() => expect(handed).toEqual(['a.csv: one', 'b.csv: two']));
    writeFileSync(join(folder, 'a.csv'), 'three');
    await until(() => expect(handed.at(-1)).toBe('a.csv: three'));
  });

  it('A32 hears of new files in a folder that was made anew', async () => {
    const folder = newFolder();
    const { watcher, handed, problems, ended } = start(folder, {}, { pollSeconds: 0.2 });
    rmSync(folder, { recursive: true });
    await until(() => expect(problems.map(({ kind }) => kind)).toContain('root gone'));
    mkdirSync(folder);
    await until(() => expect(ended.map(({ kind }) => kind)).toContain('root gone'));
    writeFileSync(join(folder, 'a.csv'), 'one');
    await until(() => expect(handed).toEqual(['a.csv: one']));
    expect(watcher.status()).toMatchObject([{ feed: 'feed', files: 1 }]);
  });

  it('A4 reads a file through once a day, and hands it over again when its bytes are not those on record', async () => {
    const folder = newFolder();
    writeFileSync(join(folder, 'a.csv'), 'one');
    let passedMs = 0;
    const clock = { now: () => new Date(), monotonicMs: () => performance.now() + passedMs };
    const read: string[] = [];
    const isAsRecorded: WatcherOptions['isAsRecorded'] = (file, bytes) => read.push(`${file.path}: ${bytes}`) > 1;
    const forgotten = new Map<string, TakenFile>();
    const recall = () => forgotten.get('a.csv') ?? null;
    const { watcher, handed } = start(folder, { clock, isAsRecorded, recall }, { pollSeconds: 0.1 });
    await until(() => expect(handed).toEqual(['a.csv: one']));
    expect(read).toEqual([]);
    passedMs = 86_400_000;
    watcher.lookNow();
    await until(() => expect(handed).toEqual(['a.csv: one', 'a.csv: one']));
    expect(read).toEqual(['a.csv: one']);
    passedMs *= 2;
    watcher.lookNow();
    await until(() => expect(read).toHaveLength(2));
    expect(handed).toHaveLength(2);
  });

  it('A33 hands files over although looking through the folder takes longer than its beat', async () => {
    const folder = newFolder();
    for (const name of ['a', 'b', 'c']) writeFileSync(join(folder, `${name}.csv`), name);
    let slowMs = 0;
    const monotonicMs = () => {
      slowMs += 2000;
      return performance.now() + slowMs;
    };
    const clock = { now: () => new Date(), monotonicMs };
    const { handed } = start(folder, { clock }, { pollSeconds: 0.1 });
    await until(() => expect(handed.sort()).toEqual(['a.csv: a', 'b.csv: b', 'c.csv: c']));
  });

  it('A34 finds every file although the notices of all but one were lost', async () => {
    const folder = newFolder();
    const emitter = Object.assign(new EventEmitter(), { close: async () => {} });
    const { watcher, handed } = start(folder, { arm: (() => emitter) as unknown as Watch });
    await until(() => expect(watcher.status()[0]?.files).toBe(0));
    // The event loop is blocked meanwhile, as in the trial in which the system dropped two notices of three.
    for (let index = 0; index < 300; index += 1) writeFileSync(join(folder, `${index}.csv`), `${index}`);
    emitter.emit('raw', 'rename', '0.csv', {});
    await until(() => expect(handed).toHaveLength(300));
    expect(new Set(handed).size).toBe(300);
  });

  it.each(['thrown', 'emitted'])(
    'A35 goes on by scans when the watch limit is used up (%s), and says so once',
    async (way) => {
      const folder = newFolder();
      const failure = Object.assign(new Error('no space left on device'), { code: 'ENOSPC' });
      const arm = (() => {
        if (way === 'thrown') throw failure;
        const emitter = Object.assign(new EventEmitter(), { close: async () => {} });
        setTimeout(() => emitter.emit('error', failure), 10);
        setTimeout(() => emitter.emit('error', failure), 20);
        return emitter;
      }) as unknown as Watch;
      const { handed, problems } = start(folder, { arm }, { pollSeconds: 0.2 });
      writeFileSync(join(folder, 'a.csv'), 'one');
      await until(() => expect(handed).toEqual(['a.csv: one']));
      await until(() => expect(problems).toHaveLength(1));
      expect(problems[0]?.message).toBe(
        'no notices of new files: the limit of file watches is used up (raise fs.inotify.max_user_watches); the folder is looked at every 0.2 s all the same',
      );
    },
  );

  it('hands over one file at a time over all feeds, and stops after the one in hand', async () => {
    const [folder, other] = [newFolder(), newFolder()];
    for (const name of ['a', 'b', 'c']) for (const where of [folder, other]) writeFileSync(join(where, name), name);
    let atWork = 0;
    let done = 0;
    const feed = {
      layout: 'csv',
      columns: null,
      recursive: false,
      pollSeconds: 3600,
      polling: false,
      expectEveryHours: null,
    } as const;
    const { watcher } = start(folder, {
      feeds: [
        { name: 'one', folder, ...feed },
        { name: 'two', folder: other, ...feed },
      ],
      onSettled: async () => {
        atWork += 1;
        expect(atWork).toBe(1);
        await new Promise((resolve) => setTimeout(resolve, 30));
        atWork -= 1;
        done += 1;
        return 'taken';
      },
    });
    await until(() => expect(done).toBeGreaterThan(1));
    await watcher.stop();
    expect(atWork).toBe(0);
    const atStop = done;
    await new Promise((resolve) => setTimeout(resolve, 100));
    expect(done).toBe(atStop);
  });

  it('reports a file that cannot be taken in once, and goes on with the others', async () => {
    const folder = newFolder();
    for (const name of ['a.csv', 'b.csv']) writeFileSync(join(folder, name), name);
    const handed: string[] = [];
    const { problems } = start(folder, {
      onSettled: async ({ path }) => {
        if (path === 'a.csv') throw new Error('the disk is full');
        handed.push(path);
        return 'taken';
      },
    });
    await until(() => expect(handed).toEqual(['b.csv']));
    await until(() =>
      expect(problems).toMatchObject([
        { kind: 'not taken in', path: 'a.csv', message: 'could not be taken in: the disk is full' },
      ]),
    );
  });

  it('goes on looking when the store cannot answer', async () => {
    const folder = newFolder();
    writeFileSync(join(folder, 'a.csv'), 'one');
    let broken = true;
    const { watcher, handed, problems, ended } = start(folder, {
      recall: () => {
        if (broken) throw new Error('database is locked');
        return null;
      },
    });
    await until(() => expect(problems).toMatchObject([{ kind: 'look failed', message: 'database is locked' }]));
    broken = false;
    watcher.lookNow();
    await until(() => expect(handed).toEqual(['a.csv: one']));
    expect(ended).toHaveLength(1);
  });

  it('goes on when the listener throws, and tells it again', async () => {
    const folder = newFolder();
    symlinkSync('nowhere', join(folder, 'link.csv'));
    let calls = 0;
    const { handed } = start(
      folder,
      {
        onProblem: () => {
          calls += 1;
          if (calls < 3) throw new Error('the disk is full');
        },
      },
      { pollSeconds: 0.2 },
    );
    await until(() => expect(calls).toBe(3));
    writeFileSync(join(folder, 'a.csv'), 'one');
    await until(() => expect(handed).toEqual(['a.csv: one']));
    expect(calls).toBe(3);
  });

  it('says how many settled files of all feeds wait behind the one in hand', async () => {
    const folder = newFolder();
    for (const name of ['a', 'b', 'c', 'd']) writeFileSync(join(folder, name), name);
    const waiting: number[] = [];
    start(folder, {
      onSettled: async (_file, _bytes, filesWaiting) => {
        waiting.push(filesWaiting);
        return 'taken';
      },
    });
    await until(() => expect(waiting).toHaveLength(4));
    expect(waiting).toEqual([3, 2, 1, 0]);
  });

  it('leaves the feed as it was', async () => {
    const folder = newFolder();
    for (const name of ['a.csv', 'b.csv']) writeFileSync(join(folder, name), name);
    const state = () =>
      readdirSync(folder).map((name) => {
        const { ino, size, mtimeMs, ctimeMs, mode } = statSync(join(folder, name));
        return { name, ino, size, mtimeMs, ctimeMs, mode };
      });
    const before = state();
    const { watcher, handed } = start(folder);
    await until(() => expect(handed).toHaveLength(2));
    await watcher.stop();
    expect(state()).toEqual(before);
  });
});

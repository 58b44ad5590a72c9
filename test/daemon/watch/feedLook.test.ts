import {
  appendFileSync,
  mkdirSync,
  readFileSync,
  renameSync,
  rmSync,
  statSync,
  truncateSync,
  utimesSync,
  writeFileSync,
} from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { createFeedLook, type FeedLook, type Look } from '../../../daemon/watch/feedLook.ts';
import type { TakenFile } from '../../../daemon/watch/feedMemory.ts';
import { isSettled, stillness } from '../../../daemon/watch/settle.ts';
import { useTemporaryFolders } from '../../support/temporaryFolder.ts';

const newFolder = useTemporaryFolders();
const SETTLE_MS = 2000;
const SETTINGS = { settleMs: SETTLE_MS, longSettleMs: 20_000, restlessMs: 3_600_000 };

/** A feed with a memory of what was taken in, and a clock that the test turns. */
function watchedFolder() {
  const folder = newFolder();
  const taken = new Map<string, TakenFile>();
  const fresh = () =>
    createFeedLook({ name: 'feed', folder, recursive: false }, (_feed, { path }) => taken.get(path) ?? null, SETTINGS);
  let watched: FeedLook = fresh();
  return {
    folder,
    at: (name: string) => join(folder, name),
    look: (nowMs: number) => watched.look(nowMs),
    /** Looks and takes in what is ready: names and contents. */
    async take(nowMs: number): Promise<string[]> {
      const { ready } = await watched.look(nowMs);
      return ready.map((file) => {
        taken.set(file.path, file.stamp);
        watched.taken(file, nowMs);
        return `${file.path}: ${readFileSync(join(folder, file.path), 'utf8')}`;
      });
    },
    restart() {
      watched = fresh();
    },
    get feed() {
      return watched;
    },
  };
}

const kinds = ({ problems }: Look) => problems.map(({ kind }) => kind);

describe('a file with rows that wait for their time', () => {
  it('is asked about again after a while, and offered once the store wants it', async () => {
    const { at, folder } = watchedFolder();
    let wanted = false;
    let asked = 0;
    let taken: TakenFile | null = null;
    const recall = () => {
      asked += 1;
      return taken === null || !wanted ? taken : { ...taken, signature: '' };
    };
    const watched = createFeedLook({ name: 'feed', folder, recursive: false }, recall, SETTINGS);
    writeFileSync(at('a.csv'), 'one');
    await watched.look(0);
    const [file] = (await watched.look(SETTLE_MS)).ready;
    taken = { ...file!.stamp, isHeld: true };
    watched.taken(file!, SETTLE_MS);
    const before = asked;
    expect((await watched.look(100_000)).moving).toBe(0);
    expect(asked).toBe(before);
    expect((await watched.look(400_000)).moving).toBe(0);
    expect(asked).toBe(before + 1);
    wanted = true;
    expect((await watched.look(800_000)).moving).toBe(1);
    expect((await watched.look(800_000 + SETTLE_MS)).ready).toHaveLength(1);
  });
});

describe('settling', () => {
  it('needs two looks at the same signature, so far apart on a clock that only grows', () => {
    const first = stillness(undefined, 'a', 1000);
    expect(isSettled(first, 1000, 0)).toBe(false);
    expect(isSettled(first, 1001, 0)).toBe(true);
    expect(isSettled(first, 2999, 2000)).toBe(false);
    expect(isSettled(stillness(first, 'a', 2000), 3000, 2000)).toBe(true);
    expect(isSettled(stillness(first, 'b', 2000), 3000, 2000)).toBe(false);
  });
});

describe('looking at a feed', () => {
  it('A1 hands over nothing of a file that is being written, then all of it once', async () => {
    const { at, take } = watchedFolder();
    for (let step = 0; step < 5; step += 1) {
      appendFileSync(at('a.csv'), `row ${step}\n`);
      expect(await take(step * 600)).toEqual([]);
    }
    const lastMs = 4 * 600;
    expect(await take(lastMs + SETTLE_MS - 1)).toEqual([]);
    expect(await take(lastMs + SETTLE_MS)).toEqual(['a.csv: row 0\nrow 1\nrow 2\nrow 3\nrow 4\n']);
    expect(await take(lastMs + 10 * SETTLE_MS)).toEqual([]);
  });

  it('A2 offers a file that was found cut again only after standing still for long, or when it changed', async () => {
    const { at, look, feed } = watchedFolder();
    writeFileSync(at('a.csv'), '55123.12');
    await look(0);
    const [cut] = (await look(2000)).ready;
    expect(cut?.stoodLong).toBe(false);
    feed.notYetWhole(cut!);
    expect((await look(6000)).ready).toEqual([]);
    expect((await look(19_999)).ready).toEqual([]);
    expect((await look(20_000)).ready).toMatchObject([{ path: 'a.csv', stoodLong: true }]);
    appendFileSync(at('a.csv'), '34\n');
    await look(20_001);
    expect((await look(22_001)).ready).toMatchObject([{ path: 'a.csv', stoodLong: false }]);
  });

  it('A3 sees an atomic replacement, A5 a rewritten file', async () => {
    const { at, take } = watchedFolder();
    writeFileSync(at('a.csv'), 'one');
    await take(0);
    expect(await take(2000)).toEqual(['a.csv: one']);
    writeFileSync(at('.new'), 'two');
    renameSync(at('.new'), at('a.csv'));
    await take(3000);
    expect(await take(5000)).toEqual(['a.csv: two']);
    writeFileSync(at('a.csv'), 'three');
    await take(6000);
    expect(await take(8000)).toEqual(['a.csv: three']);
  });

  it('A4 sees a rewrite of the same length whose modification time was put back', async () => {
    const { at, take } = watchedFolder();
    writeFileSync(at('a.csv'), 'one');
    await take(0);
    await take(2000);
    const { atime, mtime } = statSync(at('a.csv'));
    // The change time of the file system moves in steps of some milliseconds.
    await new Promise((resolve) => setTimeout(resolve, 30));
    writeFileSync(at('a.csv'), 'two');
    utimesSync(at('a.csv'), atime, mtime);
    await take(3000);
    expect(await take(5000)).toEqual(['a.csv: two']);
  });

  it.each([0, 4])(
    'A7 reports a file cut down to %i bytes, and offers it only after standing still for long',
    async (bytes) => {
      const { at, look, take } = watchedFolder();
      writeFileSync(at('a.csv'), 'row 1\nrow 2\n');
      await take(0);
      await take(2000);
      truncateSync(at('a.csv'), bytes);
      expect(kinds(await look(3000))).toEqual(['shrunk']);
      expect((await look(6000)).ready).toEqual([]);
      expect((await look(23_000)).ready).toMatchObject([{ path: 'a.csv', stoodLong: true }]);
    },
  );

  it('hands over the oldest first, and of one age by name', async () => {
    const { at, look } = watchedFolder();
    for (const [name, seconds] of [
      ['c', 300],
      ['b', 100],
      ['a', 300],
      ['d', 200],
    ] as const) {
      writeFileSync(at(name), name);
      utimesSync(at(name), seconds, seconds);
    }
    await look(0);
    expect((await look(2000)).ready.map(({ path }) => path)).toEqual(['b', 'd', 'a', 'c']);
  });

  it('knows after a restart what was taken in before', async () => {
    const { at, take, restart } = watchedFolder();
    writeFileSync(at('a.csv'), 'one');
    await take(0);
    expect(await take(2000)).toHaveLength(1);
    restart();
    writeFileSync(at('b.csv'), 'two');
    await take(0);
    expect(await take(2000)).toEqual(['b.csv: two']);
  });

  it('A32 keeps what it knows while the folder is gone, and goes on when it is back', async () => {
    const { folder, at, look, take } = watchedFolder();
    writeFileSync(at('a.csv'), 'one');
    await take(0);
    await take(2000);
    renameSync(folder, `${folder}-away`);
    const gone = await look(3000);
    expect(gone).toMatchObject({ ready: [], root: null });
    expect(kinds(gone)).toEqual(['root gone']);
    renameSync(`${folder}-away`, folder);
    writeFileSync(at('b.csv'), 'two');
    await take(4000);
    expect(await take(6000)).toEqual(['b.csv: two']);
  });

  it('A32 reports an empty folder in place of one with files', async () => {
    const { folder, at, look } = watchedFolder();
    writeFileSync(at('a.csv'), 'one');
    await look(0);
    renameSync(folder, `${folder}-away`);
    mkdirSync(folder);
    expect(kinds(await look(1000))).toEqual(['root emptied']);
    rmSync(folder, { recursive: true });
    renameSync(`${folder}-away`, folder);
    expect(kinds(await look(2000))).toEqual([]);
  });

  it('does not take a folder that was cleared for one that is gone', async () => {
    const { at, look } = watchedFolder();
    writeFileSync(at('a.csv'), 'one');
    await look(0);
    rmSync(at('a.csv'));
    expect(kinds(await look(1000))).toEqual([]);
  });

  it('reports a file that never stands still', async () => {
    const { at, look } = watchedFolder();
    writeFileSync(at('a.csv'), 'x');
    await look(0);
    appendFileSync(at('a.csv'), 'more');
    const later = await look(SETTINGS.restlessMs + 1);
    expect({ ready: later.ready, kinds: kinds(later) }).toEqual({ ready: [], kinds: ['restless'] });
  });

  it('says when the next file may be ready', async () => {
    const { at, look } = watchedFolder();
    expect((await look(0)).nextReadyInMs).toBeNull();
    writeFileSync(at('a.csv'), 'x');
    await look(100);
    expect((await look(600)).nextReadyInMs).toBe(1500);
  });
});

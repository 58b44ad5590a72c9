import { linkSync, rmSync, symlinkSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { afterEach, describe, expect, test, vi } from 'vitest';
import { systemClock } from '../../daemon/clock.ts';
import { recall } from '../../daemon/stages/intake.ts';
import { quarantineUnread } from '../../daemon/stages/unreadFile.ts';
import { createWatcher, type Watcher } from '../../daemon/watch/watcher.ts';
import { createTestStation, type TestStation } from '../support/station.ts';
import { arrivalFile, syntheticArrivals, syntheticPulsar } from '../support/syntheticPulsar.ts';

// P1: a row that stands in a settled file is either stored or listed with a reason, also where the file was never opened.

const pulsar = syntheticPulsar({ name: 'KR 0417+31', epochMjd: 61_000 });
const arrivals = syntheticArrivals(pulsar, { fromMjd: 61_001, toMjd: 61_040, everyDays: 4, seed: 5 });
const content = arrivalFile(arrivals);

const endings: (() => Promise<void>)[] = [];
afterEach(async () => {
  for (const end of endings.splice(0).reverse()) await end();
});

async function station(): Promise<TestStation> {
  const at = await createTestStation({ pulsars: [pulsar], now: '2026-04-22T08:00:00.000Z' });
  endings.push(at.close);
  return at;
}

function watch({ station: inside, pipeline }: TestStation): Watcher {
  const watcher = createWatcher({
    feeds: inside.configuration.feeds.map((feed) => ({ ...feed, pollSeconds: 0.2 })),
    recall: (feed, file) => recall(inside, feed, file.pathBytes),
    clock: systemClock,
    settleMs: 100,
    largestBytes: content.length,
    onProblem: (problem) => quarantineUnread(inside, problem),
    async onSettled({ feed, path, pathBytes, stamp }, bytes) {
      const file = { feed, path, pathBytes, bytes, signature: stamp.signature };
      await pipeline.takeIn(file, { decide: 'later', mail: false, acceptUnterminated: true });
      return 'taken';
    },
  });
  endings.push(watcher.stop);
  return watcher;
}

const until = (check: () => void) => vi.waitFor(check, { timeout: 20_000, interval: 20 });

describe('a file that is not read', () => {
  test('is quarantined whole once, whatever keeps it from being read, and is read when that is over', async () => {
    const at = await station();
    const { folder } = at.station.configuration.feeds[0]!;
    const path = (name: string) => join(folder, name);
    writeFileSync(path('large.csv'), `${content}\n`);
    writeFileSync(path('twice.csv'), content);
    linkSync(path('twice.csv'), path('.other name'));
    symlinkSync('/etc/passwd', path('link.csv'));
    const first = watch(at);
    const reasons = () => at.store.recentQuarantine(10).map(({ file, line, reason }) => `${file} ${line}: ${reason}`);
    await until(() =>
      expect(reasons().sort()).toEqual([
        `large.csv null: is ${content.length + 1} bytes long; the limit is ${content.length}`,
        'link.csv null: is a symbolic link; links are not followed',
        'twice.csv null: has 2 names (hard links); deliver a copy with one name',
      ]),
    );
    // Neither the next looks nor a restart say it again, and no feed counts as alive for it.
    const looks = first.status()[0]!.lastLookMs!;
    await until(() => expect(first.status()[0]!.lastLookMs).toBeGreaterThan(looks + 500));
    await first.stop();
    const second = watch(at);
    await until(() => expect(second.status()[0]!.problems).toHaveLength(3));
    expect(at.store.quarantinedSince('2000')).toHaveLength(3);
    expect(at.store.lastFileByFeed()).toEqual(new Map());
    expect(at.store.verify()).toEqual([]);

    rmSync(path('.other name'));
    rmSync(path('link.csv'));
    writeFileSync(path('link.csv'), content);
    await until(() => expect(at.store.recentFiles(10).filter(({ fault }) => fault === null)).toHaveLength(2));
    expect(at.store.liveArrivals('KR 0417+31')).toHaveLength(arrivals.length);
    expect(reasons()).toHaveLength(1);
    expect(at.store.verify()).toEqual([]);
  });

  test('keeps what it said before, and another reason is another entry', async () => {
    const at = await station();
    await at.deliver('a.csv', content);
    const problem = { feed: 'nightly', path: 'a.csv', pathBytes: Buffer.from('a.csv') };
    const denied = { ...problem, kind: 'unreadable', message: 'permission denied' } as const;
    for (const each of [denied, denied, { ...denied, message: 'input/output error' }])
      quarantineUnread(at.station, each);
    quarantineUnread(at.station, { ...problem, kind: 'restless', message: 'does not stop changing' });
    expect(at.store.quarantinedSince('2000').map(({ reason }) => reason)).toEqual([
      'permission denied',
      'input/output error',
    ]);
    expect(at.store.liveArrivals('KR 0417+31')).toHaveLength(arrivals.length);
    expect(await at.deliver('a.csv', content)).toMatchObject({ kind: 'taken in', newArrivals: 0, pulsars: [] });
    expect(at.store.recentQuarantine(10)).toEqual([]);
    expect(at.store.verify()).toEqual([]);
  });
});

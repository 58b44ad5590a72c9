import {
  copyFileSync,
  cpSync,
  existsSync,
  mkdirSync,
  mkdtempSync,
  readdirSync,
  readFileSync,
  rmSync,
  writeFileSync,
} from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, afterEach, beforeAll, beforeEach, expect, test } from 'vitest';
import { loadConfiguration } from '../../../daemon/config/loadConfiguration.ts';
import { makeRunFolder } from '../../../daemon/demo/runFolder.ts';
import { ROOT } from '../../support/sourceTree.ts';

/** The sample feeds with their last nights only. */
const sampleFeeds = mkdtempSync(join(tmpdir(), 'spinvigil-few-nights-'));
const FEEDS = ['main', 'annex', 'monitor'];
const NIGHTS_KEPT = 8;
beforeAll(() => {
  const whole = join(ROOT, 'sample-feeds');
  for (const copied of ['models', 'clock', 'spinvigil.toml']) {
    cpSync(join(whole, copied), join(sampleFeeds, copied), { recursive: true });
  }
  for (const feed of FEEDS) {
    mkdirSync(join(sampleFeeds, feed));
    const names = readdirSync(join(whole, feed)).slice(-NIGHTS_KEPT);
    for (const name of names) copyFileSync(join(whole, feed, name), join(sampleFeeds, feed, name));
  }
});
afterAll(() => rmSync(sampleFeeds, { recursive: true, force: true }));

/** Larger than any process number that Linux gives out. */
const NO_PROCESS = 2 ** 22 + 1;

let folder: string;
beforeEach(() => {
  folder = join(mkdtempSync(join(tmpdir(), 'spinvigil-demo-')), 'run');
});
afterEach(() => rmSync(join(folder, '..'), { recursive: true, force: true }));

const make = (port = 8417) => makeRunFolder(folder, sampleFeeds, { liveNights: 3, port });
const claimedBy = (pids: readonly number[]) =>
  writeFileSync(join(folder, 'made-by-the-demo.json'), JSON.stringify({ pids }));

test('history is laid out, the last nights are held back and come when they are delivered', () => {
  const run = make();
  const all = readdirSync(join(sampleFeeds, 'main'));
  expect(run.nights).toEqual(all.slice(-3).map((name) => name.replace('.csv', '')));
  expect(readdirSync(join(folder, 'main'))).toEqual(all.slice(0, -3));
  expect(run.history.every(existsSync)).toBe(true);
  for (const night of run.nights) {
    for (const feed of run.deliver(night)) {
      const there = readFileSync(join(folder, feed, `${night}.csv`), 'utf8');
      expect(there).toBe(readFileSync(join(sampleFeeds, feed, `${night}.csv`), 'utf8'));
    }
  }
  expect(readdirSync(join(folder, 'main'))).toEqual(all);
  expect(readdirSync(join(folder, 'staging'))).toEqual([]);
});

test('the configuration is the sample feeds’ own, with state, mail and port of the run', () => {
  const { configuration, problems } = loadConfiguration(make(8423).configFile);
  expect(problems).toEqual([]);
  const { stateFolder, mail, review, feeds, models } = configuration!;
  expect(stateFolder).toBe(join(folder, 'state'));
  expect(mail.transport).toEqual({ kind: 'folder', folder: join(folder, 'mail') });
  expect(review.port).toBe(8423);
  expect(feeds.map((feed) => feed.folder)).toEqual(FEEDS.map((feed) => join(folder, feed)));
  expect(models.size).toBe(12);
});

test('a finished run makes way for the next, whole', () => {
  make();
  writeFileSync(join(folder, 'main', 'left-over.csv'), 'x');
  claimedBy([NO_PROCESS]);
  make();
  expect(existsSync(join(folder, 'main', 'left-over.csv'))).toBe(false);
});

test('a run that is still at work is left alone', () => {
  make();
  claimedBy([NO_PROCESS, process.pid]);
  expect(() => make()).toThrow(`process ${process.pid}`);
  expect(existsSync(join(folder, 'spinvigil.toml'))).toBe(true);
});

test('a folder of somebody else is left alone', () => {
  mkdirSync(folder);
  writeFileSync(join(folder, 'thesis.txt'), 'years of work');
  expect(() => make()).toThrow('was not made by the demo');
  expect(readdirSync(folder)).toEqual(['thesis.txt']);
});

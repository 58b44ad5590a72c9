import { cpSync, existsSync, mkdtempSync, readdirSync, readFileSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import type { MorningReview } from '../../alerts/morningReview.ts';
import type { PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import { madeFiles } from '../../sample-feeds/generate.ts';
import type { Expected } from '../../sample-feeds/making/expected.ts';
import { sameButForTheLastDigit } from '../support/madeFiles.ts';
import { ROOT } from '../support/sourceTree.ts';
import { runInstalled, spinvigilJson } from '../support/spinvigil.ts';

const SAMPLE_FEEDS = join(ROOT, 'sample-feeds');
const expected: Expected = JSON.parse(readFileSync(join(SAMPLE_FEEDS, 'expected.json'), 'utf8'));
const FEEDS = ['main', 'annex', 'monitor'];

const arrivalFiles = (folder: string): string[] =>
  FEEDS.flatMap((feed) => readdirSync(join(folder, feed)).map((name) => join(folder, feed, name)));

describe('the committed sample feeds', () => {
  test('are what the generator makes', () => {
    const made = madeFiles();
    const committed = ['models', 'clock', ...FEEDS].flatMap((folder) =>
      readdirSync(join(SAMPLE_FEEDS, folder)).map((name) => `${folder}/${name}`),
    );
    expect(made.map(({ path }) => path).sort()).toEqual([...committed, 'expected.json'].sort());
    const different = made.filter(
      ({ path, content }) => !sameButForTheLastDigit(content, readFileSync(join(SAMPLE_FEEDS, path), 'utf8')),
    );
    expect(different.map(({ path }) => path)).toEqual([]);
  });

  test('are compared digit by digit', () => {
    expect(sameButForTheLastDigit('a,60993.1000000000000\n', 'a,60993.1000000000001\n')).toBe(true);
    expect(sameButForTheLastDigit('a,60993.1000000000000\n', 'a,60993.1000000000100\n')).toBe(false);
    expect(sameButForTheLastDigit('a,60993.1\n', 'b,60993.1\n')).toBe(false);
  });
});

interface ArrivalLine {
  readonly mjd: string | null;
  readonly receiver: string | null;
  readonly fate: string;
  readonly reason: string;
}

// The real command, the whole of the feeds, a state folder of its own; what comes out is held to what was planted.
describe('a replay of the sample feeds', () => {
  const folder = mkdtempSync(join(tmpdir(), 'spinvigil-sample-'));
  const config = join(folder, 'sample-feeds', 'spinvigil.toml');
  let events: PulsarEvent[] = [];
  let morning: MorningReview;

  beforeAll(async () => {
    cpSync(SAMPLE_FEEDS, join(folder, 'sample-feeds'), { recursive: true });
    const files = arrivalFiles(join(folder, 'sample-feeds'));
    const replay = await runInstalled(['replay', ...files, '--config', config]);
    expect(replay.code, replay.stderr).toBe(0);
    events = await spinvigilJson<PulsarEvent[]>(['events', '--config', config]);
    morning = await spinvigilJson<MorningReview>(['morning', '--config', config]);
  }, 240_000);

  afterAll(() => rmSync(folder, { recursive: true, force: true }));

  /** What is laid to the pulsar's own account: an event of the site names several. */
  const confirmed = (pulsar: string): PulsarEvent[] =>
    events.filter((event) => event.pulsar === pulsar && event.pulsars.length === 1 && event.state === 'confirmed');

  test.each(expected.glitches)('finds the glitch of $pulsar once, with its size', (glitch) => {
    const found = confirmed(glitch.pulsar);
    expect(found.map(({ explanation }) => explanation)).toEqual(['glitch']);
    const event = found[0]!;
    expect(Math.abs(event.epochMjd - glitch.epochMjd)).toBeLessThanOrEqual(glitch.epochWithinDays);
    expect(Math.abs(event.deltaNuOverNu! / glitch.deltaNuOverNu - 1)).toBeLessThanOrEqual(glitch.sizeWithin);
    const [least, most] = glitch.confirmedAfterDays;
    expect(event.confirmedAtMjd! - glitch.epochMjd).toBeGreaterThanOrEqual(least);
    expect(event.confirmedAtMjd! - glitch.epochMjd).toBeLessThanOrEqual(most);
  });

  test.each(expected.dispersionSteps)('calls the dispersion step of $pulsar by its name', (step) => {
    const found = confirmed(step.pulsar);
    expect(found.map(({ explanation }) => explanation)).toEqual(['dispersion step']);
    expect(Math.abs(found[0]!.epochMjd - step.epochMjd)).toBeLessThanOrEqual(step.epochWithinDays);
  });

  test.each(expected.siteEvents)('A42: blames the clock at $site, not the pulsars seen there', (step) => {
    const found = events.filter(({ pulsars, state }) => pulsars.length > 1 && state === 'confirmed');
    expect(found.map(({ site, explanation }) => ({ site, explanation }))).toEqual([
      { site: step.site, explanation: 'clock step' },
    ]);
    const event = found[0]!;
    expect(Math.abs(event.epochMjd - step.epochMjd)).toBeLessThanOrEqual(step.epochWithinDays);
    expect(Math.abs(event.timeStepUs! / step.timeStepUs - 1)).toBeLessThanOrEqual(step.sizeWithin);
    expect(step.pulsars).toEqual(expect.arrayContaining([...event.pulsars]));
    expect(event.pulsars.length).toBeGreaterThanOrEqual(3);
  });

  test.each(expected.badSessions)('sets the bad session of $pulsar aside', async (session) => {
    const arrivals = await spinvigilJson<ArrivalLine[]>(['arrivals', session.pulsar, '--config', config]);
    const ofThatNight = arrivals.filter(
      ({ mjd, receiver }) => Math.floor(Number(mjd)) === session.nightMjd && session.receivers.includes(receiver!),
    );
    expect(ofThatNight.map(({ receiver }) => receiver).sort()).toEqual([...session.receivers].sort());
    expect(ofThatNight.map(({ fate }) => fate)).toEqual(session.receivers.map(() => 'set aside'));
    expect(confirmed(session.pulsar).filter(({ explanation }) => explanation !== 'bad session')).toEqual([]);
  });

  test('leaves the quiet pulsars alone, the noisy one too', () => {
    expect(expected.quiet).toContain(expected.noisy);
    expect(expected.quiet.flatMap(confirmed)).toEqual([]);
  });

  test('quarantines the broken rows with file, line and reason, and nothing else', () => {
    const place = ({ feed, file, line }: { feed: string; file: string; line: number | null }) =>
      `${feed}/${file}:${line}`;
    expect(morning.quarantined.map(place).sort()).toEqual(expected.quarantined.map(place).sort());
    for (const wanted of expected.quarantined) {
      const found = morning.quarantined.find((row) => place(row) === place(wanted));
      expect(found?.reason).toContain(wanted.reason);
    }
  });

  test('lists a broken row with the arrivals of its pulsar, and a reason with each', async () => {
    // The row of line 3 in happenings.ts: its date cannot be read, its name can.
    const arrivals = await spinvigilJson<ArrivalLine[]>(['arrivals', 'KR 0529+22', '--config', config]);
    const broken = arrivals.filter(({ fate }) => fate === 'quarantined');
    expect(broken.map(({ mjd }) => mjd)).toEqual([null]);
    expect(broken[0]!.reason).toMatch(/^main\/2025-11-14\.csv, line 3: mjd_utc /);
    expect(arrivals.filter(({ reason }) => reason.trim() === '')).toEqual([]);
  });

  test('takes every good row of every file', () => {
    const files = arrivalFiles(SAMPLE_FEEDS);
    const rows = files.map((file) => Math.max(0, readFileSync(file, 'utf8').trim().split('\n').length - 1));
    const brokenRows = expected.quarantined.filter(({ line }) => line !== null).length;
    const brokenFiles = expected.quarantined.length - brokenRows;
    expect(morning.intake).toMatchObject({
      files: files.length - brokenFiles,
      arrivals: rows.reduce((sum, count) => sum + count) - brokenRows,
    });
  });

  test('writes nothing beside the feeds and sends no mail', () => {
    expect(readdirSync(join(folder, 'sample-feeds')).sort()).toEqual(readdirSync(SAMPLE_FEEDS).sort());
    const mail = join(folder, '.demo', 'mail');
    expect(existsSync(mail) ? readdirSync(mail) : []).toEqual([]);
  });
});

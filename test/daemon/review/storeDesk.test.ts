import { afterEach, beforeEach, expect, test } from 'vitest';
import type { Clock } from '../../../daemon/clock.ts';
import { loadConfiguration } from '../../../daemon/config/loadConfiguration.ts';
import { morningReview } from '../../../daemon/morning.ts';
import type { ReviewDesk } from '../../../daemon/review/desk.ts';
import { createStoreDesk } from '../../../daemon/review/storeDesk.ts';
import { emptyBatch, type Store } from '../../../daemon/store/index.ts';
import { createObservatory, type TestObservatory } from '../../support/observatory.ts';
import { samplePlan } from '../../support/reviewDesk.ts';
import { syntheticPulsar } from '../../support/syntheticPulsar.ts';
import { AT, fileBatch, LATER, open, sampleEvent, sampleFile, sampleMessage, upsert } from '../store/sample.ts';
import { fillForm, postVerdict, startSite } from './reviewSite.ts';

// The page's desk over the real store.

const ID = sampleEvent().id;
let observatory: TestObservatory;
let store: Store;
let desk: ReviewDesk;
let nowMs: number;
let mornings: number;

beforeEach(async () => {
  const pulsars = ['KR 0417+31', 'KR 1118+62'].map((name) => syntheticPulsar({ name, epochMjd: 60_000 }));
  observatory = await createObservatory({ pulsars, expectEveryHours: 24 });
  const { configuration } = loadConfiguration(observatory.configFile);
  if (configuration === null) throw new Error('the configuration of the test does not load');
  store = open(configuration.stateFolder);
  nowMs = Date.parse(LATER);
  mornings = 0;
  const clock: Clock = { now: () => new Date(nowMs), monotonicMs: () => nowMs };
  desk = createStoreDesk({
    configuration,
    store,
    clock,
    morning: () => {
      mornings += 1;
      return morningReview({ configuration, store, clock, warnings: [] });
    },
    health: () => ({ ok: true, problems: [] }),
    vitalSigns: () => {
      throw new Error('nobody asked');
    },
    metrics: () => '',
  });
});

afterEach(async () => {
  store.close();
  await observatory.remove();
});

test('shows what is on record', () => {
  store.commitIntake({ ...fileBatch(0, 3), events: [upsert()], messages: [sampleMessage()] });
  expect(desk.events().map(({ event }) => event.id)).toEqual([ID]);
  expect(desk.event(ID)?.revision).toBe(1);
  expect(desk.morning().waiting.map(({ id }) => id)).toEqual([ID]);
  expect(desk.files(10).map(({ path, rows, stored }) => [path, rows, stored])).toEqual([['night-1.csv', 3, 3]]);
  expect(desk.outbox(10).map(({ state, eventId }) => [state, eventId])).toContainEqual(['queued', ID]);
  expect(desk.pulsars().map(({ pulsar }) => pulsar)).toEqual(['KR 0417+31', 'KR 1118+62']);
  const nightly = { feed: 'nightly', lastFileAt: AT, hoursSince: 1, expectEveryHours: 24, silent: false };
  expect(desk.feeds()).toEqual([nightly]);
  nowMs += 3 * 86_400_000;
  expect(desk.feeds()[0]?.silent).toBe(true);
  expect(desk.notice(ID, new Date(nowMs))).toContain('VOEvent');
  expect([desk.event('none'), desk.notice('none', new Date(nowMs))]).toEqual([null, null]);
});

test('the plan of an event is the one kept with the last decision about its pulsar', () => {
  const plan = samplePlan(sampleEvent());
  const noise = { phaseWalk: 0, frequencyWalk: 0, torqueWalk: 0, uncertaintyScale: 1, floorTurns: 0 };
  const report = { pulsar: plan.pulsar, basis: '', events: [], locked: true, noise, lastArrivalMjd: null };
  store.commitIntake({ ...fileBatch(0, 3), events: [upsert()], reports: [report] });
  const record = store.event(ID)!;
  expect(desk.plan(record)).toBeNull();
  store.commitIntake({ ...emptyBatch(LATER), reports: [{ ...report, plan }] });
  expect(desk.plan(record)).toEqual(plan);
  // A clock that stepped is planned for by nobody.
  expect(desk.plan({ ...record, event: { ...record.event, site: 'north' } })).toBeNull();
});

test('lists files and quarantine newest first, and drops what a later delivery put right', () => {
  store.commitIntake({ ...fileBatch(0, 1, { rows: 2 }), quarantined: [{ line: 2, reason: 'no number' }] });
  const south = sampleFile(1, { path: 'b.csv' });
  store.commitIntake({ ...emptyBatch(LATER), file: south, quarantined: [{ line: 9, reason: 'unknown site' }] });
  expect(desk.files(10).map(({ path }) => path)).toEqual(['b.csv', 'night-1.csv']);
  expect(desk.files(1).map(({ path }) => path)).toEqual(['b.csv']);
  expect(desk.quarantine(10).map(({ file, line }) => [file, line])).toEqual([
    ['b.csv', 9],
    ['night-1.csv', 2],
  ]);
  const again = sampleFile(1, { path: 'b.csv', sha256: 'bb'.repeat(32), signature: '1000:2' });
  store.commitIntake({ ...fileBatch(5, 1), at: LATER, file: again });
  expect(desk.quarantine(10).map(({ file }) => file)).toEqual(['night-1.csv']);
});

test('a verdict on the page is a verdict on record, once, and a stale one is none', async () => {
  store.commitIntake({ ...fileBatch(0, 3), events: [upsert()] });
  const { url } = await startSite({ desk });
  const form = await fillForm(url, ID);
  const other = { ...form, verdict: 'reject', by: 'timing' };
  expect((await postVerdict(url, form, {}, ID)).status).toBe(303);
  expect((await postVerdict(url, form, {}, ID)).status).toBe(303);
  const refused = await postVerdict(url, other, {}, ID);
  expect([refused.status, (await refused.text()).includes('What you judged, revision 1')]).toEqual([409, true]);
  expect(store.event(ID)?.verdicts.map(({ verdict, by, revision }) => [verdict, by, revision])).toEqual([
    ['accept', 'duty', 1],
  ]);
  expect(desk.decisions(5).map(({ event, verdict }) => [event.state, verdict?.by])).toEqual([['accepted', 'duty']]);
  expect(desk.morning().waiting).toEqual([]);
});

test('the version moves with files, mail, events and verdicts, and only then', () => {
  const seen = [desk.version(), desk.version()];
  expect(seen[0]).toBe(seen[1]);
  const moved = (change: () => void) => {
    const before = desk.version();
    change();
    expect(desk.version()).not.toBe(before);
  };
  moved(() => store.commitIntake(fileBatch(0, 3)));
  moved(() => store.commitIntake({ ...emptyBatch(LATER), events: [upsert()] }));
  moved(() => store.commitIntake({ ...emptyBatch(LATER), messages: [sampleMessage()] }));
  moved(() =>
    desk.recordVerdict({ eventId: ID, expectedRevision: 1, verdict: 'reject', by: 'duty', note: '', at: LATER }),
  );
});

test('pages share one morning review until something changes or a minute has passed', () => {
  desk.morning();
  desk.feeds();
  desk.pulsars();
  expect(mornings).toBe(1);
  store.commitIntake(fileBatch(0, 3));
  desk.morning();
  expect(mornings).toBe(2);
  nowMs += 61_000;
  desk.morning();
  expect(mornings).toBe(3);
});

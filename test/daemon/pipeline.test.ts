import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { asyncProperty, assert as checkProperty, constantFrom, shuffledSubarray } from 'fast-check';
import { describe, expect, test } from 'vitest';
import { STAGES } from '../../daemon/pipeline.ts';
import { isAsRecorded, recall } from '../../daemon/stages/intake.ts';
import { ROOT } from '../support/sourceTree.ts';
import { createTestStation, type TestStation } from '../support/station.ts';
import { stationForTest } from '../support/stationForTest.ts';
import { arrivalFile, syntheticArrivals, syntheticPulsar } from '../support/syntheticPulsar.ts';

const START = 61_000;
const glitching = syntheticPulsar({
  name: 'KR 0417+31',
  epochMjd: START,
  glitches: [{ mjd: START + 60, deltaNuOverNu: 2e-7 }],
});
const quiet = syntheticPulsar({ name: 'KR 1021-05', epochMjd: START });
const span = { fromMjd: START + 1, toMjd: START + 80, everyDays: 4 };
const glitchingArrivals = syntheticArrivals(glitching, { ...span, seed: 3 });
const quietArrivals = syntheticArrivals(quiet, { ...span, seed: 4 });
/** Three files a pulsar shares with the other, and one that holds late rows of all times. */
const FILES = new Map(
  [0, 1, 2, 3].map((part) => {
    const mine = (_: unknown, i: number) => (i % 9 === 4 ? part === 3 : part === Math.floor(i / 7));
    return [`part-${part}.csv`, arrivalFile([...glitchingArrivals.filter(mine), ...quietArrivals.filter(mine)])];
  }),
);
const ALL = arrivalFile([...glitchingArrivals, ...quietArrivals]);
/** Just after the last arrival: MJD 61081. */
const NOW = '2026-02-10T08:00:00.000Z';
/** Two weeks after the glitch. */
const AT_THE_GLITCH = '2026-02-04T08:00:00.000Z';

function station(): Promise<TestStation> {
  return stationForTest({ pulsars: [glitching, quiet], now: NOW });
}

const eventsOf = ({ store }: TestStation) => store.events().map(({ event }) => event);
const reportsOf = ({ store }: TestStation) => store.pulsarReports();

describe('the pipeline', () => {
  test('has the stages that DEVELOPERS.md draws', () => {
    const drawing = readFileSync(join(ROOT, 'DEVELOPERS.md'), 'utf8');
    expect(drawing).toContain(STAGES.join(' → '));
  });

  test('finds the glitch that is there, once', async () => {
    const at = await station();
    await at.deliver('all.csv', ALL);
    const [event, ...others] = eventsOf(at);
    expect(others).toEqual([]);
    expect(event).toMatchObject({ pulsar: 'KR 0417+31', explanation: 'glitch', state: 'confirmed' });
    expect(Math.abs(event!.epochMjd - (START + 60))).toBeLessThan(4);
    expect(at.store.verify()).toEqual([]);
  });

  test('A20: says the same whatever the order of the files, and however often it was restarted', async () => {
    const reference = await station();
    await reference.deliver('all.csv', ALL);
    const names = [...FILES.keys()];
    await checkProperty(
      asyncProperty(
        shuffledSubarray(names, { minLength: names.length }),
        constantFrom('goes on', 'restarts', 'decides at the end', 'decides now and then'),
        async (order, how) => {
          let at = await createTestStation({ pulsars: [glitching, quiet], now: NOW });
          try {
            for (const name of order) {
              const decide = how.startsWith('decides') ? 'later' : 'now';
              const { open } = await at.deliver(name, FILES.get(name)!, { decide });
              if (how === 'decides now and then') await at.pipeline.decideOpen(open);
              if (how === 'restarts') at = at.restart();
            }
            if (how === 'decides at the end') await at.pipeline.decide(at.store.pulsars(), { mail: false });
            expect(eventsOf(at)).toEqual(eventsOf(reference));
            expect(reportsOf(at)).toEqual(reportsOf(reference));
            expect(at.store.verify()).toEqual([]);
          } finally {
            await at.close();
          }
        },
      ),
      { seed: 11, numRuns: 5 },
    );
  });

  test('takes a file that only was touched, or comes again, for what it is', async () => {
    const at = await station();
    await at.deliver('all.csv', ALL);
    const before = eventsOf(at);
    expect(await at.deliver('all.csv', ALL)).toMatchObject({ kind: 'known', newArrivals: 0 });
    expect(await at.deliver('copy.csv', ALL)).toMatchObject({ kind: 'taken in', newArrivals: 0, pulsars: [] });
    expect(eventsOf(at)).toEqual(before);
  });

  test('A4: takes in a silent edit, of which only the bytes tell, and says so', async () => {
    const at = await station();
    const content = arrivalFile(quietArrivals);
    await at.deliver('a.csv', content);
    const pathBytes = Buffer.from('a.csv');
    const look = () => recall(at.station, 'nightly', pathBytes)!;
    const { signature, bytes } = look();
    const file = { feed: 'nightly', path: 'a.csv', pathBytes, signature };
    const edited = Buffer.from(content.replace(',50.000,', ',60.000,'));
    const options = { decide: 'now', mail: false, acceptUnterminated: true } as const;
    expect(edited).toHaveLength(bytes);
    expect((await at.pipeline.takeIn({ ...file, bytes: edited }, options)).kind).toBe('known');

    expect(isAsRecorded(at.station, file, Buffer.from(content))).toBe(true);
    expect(isAsRecorded(at.station, file, edited)).toBe(false);
    expect(look().signature).not.toBe(signature);
    expect(await at.pipeline.takeIn({ ...file, bytes: edited }, options)).toMatchObject({ kind: 'taken in' });
    expect(at.store.liveArrivals(quiet.name).filter(({ uncertaintyUs }) => uncertaintyUs === 60)).toHaveLength(1);
    expect(at.store.verify()).toEqual([]);
  });

  test('A5, A6: decides again when rows are corrected or taken back, and as if the corrected ones had been the first', async () => {
    const at = await station();
    const wrong = glitchingArrivals.map((a, i) => (i === 10 ? { ...a, uncertaintyUs: 5000 } : a));
    await at.deliver('a.csv', arrivalFile(wrong));
    await at.deliver('a.csv', arrivalFile(glitchingArrivals.slice(0, -2)));
    const straight = await station();
    await straight.deliver('a.csv', arrivalFile(glitchingArrivals.slice(0, -2)));
    expect(eventsOf(at)).toEqual(eventsOf(straight));
    const status = at.store.arrivals('KR 0417+31').map((arrival) => arrival.status);
    expect(status.filter((s) => s === 'revised')).toHaveLength(1);
    expect(status.filter((s) => s === 'withdrawn')).toHaveLength(2);
    // What was never told vanishes with the rows it rested on.
    await at.deliver('a.csv', arrivalFile(glitchingArrivals.slice(0, 12)));
    expect(eventsOf(at)).toEqual([]);
    expect(at.store.verify()).toEqual([]);
  });

  test('leaves a file whose last row may still grow, and takes it when told so', async () => {
    const at = await station();
    const cut = arrivalFile(quietArrivals.slice(0, 5)).trimEnd();
    expect(await at.deliver('cut.csv', cut, { acceptUnterminated: false })).toMatchObject({ kind: 'cut short' });
    expect(at.store.arrivals('KR 1021-05')).toEqual([]);
    expect(await at.deliver('cut.csv', cut)).toMatchObject({ kind: 'taken in', newArrivals: 5 });
  });

  test('A24, A25: quarantines what it has no model or site for, and says what to add', async () => {
    const at = await station();
    const rows = [
      'pulsar,mjd_utc,mjd_tdb,uncertainty_us,frequency_mhz,site',
      'KR 0417+13,,61010.5,50,inf,barycentre',
      'KR 1021-05,61010.5,,50,1400,ridge',
      'KR 1021-05,,61011.5,50,inf,barycentre',
    ];
    expect(await at.deliver('odd.csv', `${rows.join('\n')}\n`)).toMatchObject({
      rows: 3,
      newArrivals: 1,
      quarantined: 2,
    });
    const reasons = at.store.quarantinedSince('2000').map(({ line, reason }) => `${line}: ${reason}`);
    expect(reasons[0]).toMatch(/^2: pulsar "KR 0417\+13" has no model \(did you mean "KR 0417\+31"\?\): add one/);
    expect(reasons[1]).toMatch(/^3: site "ridge" is not known: add a \[\[site\]\]/);
  });

  test('A25: reads a waiting file again once the configuration knows more, and only then', async () => {
    const at = await station();
    const { configuration } = at.station;
    const poorer = { ...configuration, models: new Map([...configuration.models].slice(0, 1)) };
    const before = at.restart(poorer);
    expect(await before.deliver('all.csv', ALL)).toMatchObject({ quarantined: quietArrivals.length });
    expect(await before.restart(poorer).deliver('all.csv', ALL)).toMatchObject({ kind: 'known' });
    expect(await before.restart(configuration).deliver('all.csv', ALL)).toMatchObject({
      kind: 'taken in',
      newArrivals: quietArrivals.length,
      quarantined: 0,
    });
  });

  test('decides again when a model changes, with the arrivals timed anew', async () => {
    const at = await station();
    const withDispersion = ALL.replaceAll(',inf,', ',1400,');
    await at.deliver('all.csv', withDispersion);
    expect(at.pipeline.undecided()).toEqual([]);
    const { configuration } = at.station;
    const model = { ...configuration.models.get('KR 0417+31')!, dispersionMeasure: 50 };
    const changed = at.restart({ ...configuration, models: new Map([...configuration.models, [model.name, model]]) });
    expect(changed.pipeline.undecided()).toEqual(['KR 0417+31']);
    const timeOf = () => at.store.arrivals('KR 0417+31')[0]!.delays!.dispersionS;
    const before = timeOf();
    await changed.pipeline.decide(['KR 0417+31'], { mail: false });
    expect(timeOf() / before).toBeCloseTo(50 / 41.27, 10);
    expect(changed.pipeline.undecided()).toEqual([]);
    expect(eventsOf(changed)).toHaveLength(1);
  });

  test('keeps what is on record of a pulsar whose model was taken away', async () => {
    const at = await station();
    await at.deliver('all.csv', ALL);
    const before = eventsOf(at);
    const { configuration } = at.station;
    const poorer = at.restart({ ...configuration, models: new Map([...configuration.models].slice(1)) });
    expect(poorer.station.configuration.models.has('KR 0417+31')).toBe(false);
    poorer.setNow('2026-02-14T08:00:00.000Z');
    const more = arrivalFile(syntheticArrivals(quiet, { ...span, fromMjd: START + 81, toMjd: START + 85, seed: 9 }));
    const grown = ALL + more.split('\n').slice(1).join('\n');
    expect(await poorer.deliver('all.csv', grown)).toMatchObject({
      kind: 'taken in',
      quarantined: 0,
      pulsars: ['KR 1021-05'],
    });
    expect(eventsOf(at)).toEqual(before);
    expect(at.store.liveArrivals('KR 0417+31')).toHaveLength(glitchingArrivals.length);
  });

  test('remembers decisions that were left open', async () => {
    const at = await station();
    await at.deliver('all.csv', ALL, { decide: 'later' });
    const next = at.restart();
    expect(next.pipeline.undecided()).toEqual(['KR 0417+31', 'KR 1021-05']);
    await next.pipeline.decide(next.pipeline.undecided(), { mail: false });
    expect(next.pipeline.undecided()).toEqual([]);
    expect(eventsOf(next)).toHaveLength(1);
  });

  test('decides old arrivals later and fresh ones in the same transaction; both are mailed by the same rule', async () => {
    const old = await station();
    old.setNow('2027-06-01T08:00:00.000Z');
    const later = await old.deliver('all.csv', ALL, { decide: 'now if fresh', mail: true });
    expect(later).toMatchObject({ isFresh: false, open: ['KR 0417+31', 'KR 1021-05'], events: 0 });
    expect(await old.pipeline.decideOpen(later.open)).toBe(0);
    expect(eventsOf(old)).toHaveLength(1);
    expect(old.pipeline.undecided()).toEqual([]);

    const fresh = await station();
    fresh.setWallClock(AT_THE_GLITCH);
    const now = await fresh.deliver('all.csv', ALL, { decide: 'now if fresh', mail: true });
    expect(now).toMatchObject({ isFresh: true, open: [], events: 1, mails: 1 });

    const inABurst = await station();
    inABurst.setWallClock(AT_THE_GLITCH);
    const { open: undecided } = await inABurst.deliver('all.csv', ALL, { decide: 'later', mail: true });
    expect(await inABurst.pipeline.decideOpen(undecided)).toBe(1);
    const subjects = (at: TestStation) => at.store.outbox().map(({ subject }) => subject);
    expect(subjects(inABurst)).toEqual(subjects(fresh));
  });

  test('A22 holds arrivals from the future, and takes them in when their time has come', async () => {
    const at = await station();
    at.setWallClock('2026-01-18T00:00:00.000Z');
    const past = glitchingArrivals.filter(({ mjdText }) => Number(mjdText) <= 61_059).length;
    expect(past).toBeGreaterThan(5);
    const file = arrivalFile(glitchingArrivals);
    expect(await at.deliver('a.csv', file)).toMatchObject({
      newArrivals: past,
      quarantined: glitchingArrivals.length - past,
      events: 0,
    });
    const [first] = at.store.quarantinedSince('2000');
    expect(first?.reason).toMatch(
      /^is dated [0-9.]+ days after the clock of this machine: held until that time has come/,
    );
    const remembered = () => recall(at.station, 'nightly', Buffer.from('a.csv'));
    expect(remembered()).toMatchObject({ isHeld: true });
    expect(await at.deliver('a.csv', file)).toMatchObject({ kind: 'known' });
    // A clock that is set back takes nothing away.
    at.setWallClock('2020-01-01T00:00:00.000Z');
    expect(await at.deliver('a.csv', `${file}\n`)).toMatchObject({ newArrivals: 0, pulsars: [] });
    expect(at.store.liveArrivals('KR 0417+31')).toHaveLength(past);
    at.setWallClock(NOW);
    expect(remembered()).toMatchObject({ signature: '' });
    expect(await at.deliver('a.csv', `${file}\n`)).toMatchObject({
      newArrivals: glitchingArrivals.length - past,
      quarantined: 0,
    });
    expect(remembered()).toMatchObject({ isHeld: false });
    expect(at.store.verify()).toEqual([]);
  });

  test('A41: sets a file aside whose reading takes the program down again and again', async () => {
    const at = await station();
    const path = { bytesHex: Buffer.from('poison.csv').toString('hex') };
    const { createHash } = await import('node:crypto');
    const sha256 = createHash('sha256').update(ALL).digest('hex');
    for (let start = 0; start < 3; start++) at.store.noteReadingStarts('nightly', path, sha256);
    expect(await at.deliver('poison.csv', ALL)).toMatchObject({ kind: 'quarantined whole' });
    expect(at.store.quarantinedSince('2000')[0]?.reason).toMatch(/^set aside: its reading was begun 3 times/);
    expect(await at.deliver('fine.csv', ALL)).toMatchObject({ kind: 'taken in' });
    // Touched, it gets another chance.
    expect(await at.deliver('poison.csv', ALL)).toMatchObject({ kind: 'taken in' });
  });
});

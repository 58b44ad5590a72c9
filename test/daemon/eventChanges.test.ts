import { describe, expect, test } from 'vitest';
import type { ListedEvent } from '../../daemon/records.ts';
import { changeInWords, eventChanges } from '../../daemon/stages/eventChanges.ts';
import type { PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import { sampleEvent } from './store/sample.ts';

const glitch = (changes: Partial<PulsarEvent> = {}): PulsarEvent =>
  sampleEvent({
    id: 'kr-1-a',
    pulsar: 'KR 1',
    explanations: { glitch: 0.999 },
    epochMjd: 60000,
    epochInterval68: [59999.5, 60000.5],
    epochInterval95: [59999, 60001],
    deltaNuHz: 1e-7,
    deltaNuHzInterval68: [0.9e-7, 1.1e-7],
    deltaNuOverNu: 1e-8,
    deltaNuOverNuInterval68: [0.9e-8, 1.1e-8],
    firstArrivalMjd: 60001,
    suspectedAtMjd: 60002,
    confirmedAtMjd: 60003,
    arrivalsUsed: 20,
    pulsars: ['KR 1'],
    ...changes,
  });

const record = (event: PulsarEvent, changes: Partial<ListedEvent> = {}): ListedEvent => ({
  event,
  detectorState: event.state,
  lastKept: event,
  revision: 1,
  told: true,
  createdAt: '2026-06-01T00:00:00.000Z',
  changedAt: '2026-06-01T00:00:00.000Z',
  ...changes,
});

describe('a new derivation against the record', () => {
  test('an event that is new', () => {
    const { kept, dropped } = eventChanges([glitch()], []);
    expect(kept).toMatchObject([{ before: null, revision: 1, what: 'confirmed as glitch' }]);
    expect(dropped).toEqual([]);
  });

  test('an event that is the same to the last digit is not written again', () => {
    expect(eventChanges([glitch()], [record(glitch())])).toEqual({ kept: [], dropped: [] });
  });

  test('a change of digits is kept without a revision, and many such add up to one', () => {
    const small = eventChanges([glitch({ arrivalsUsed: 21, deltaNuOverNu: 1.05e-8 })], [record(glitch())]);
    expect(small.kept).toMatchObject([{ revision: 1, what: null }]);
    const drifted = record(glitch({ deltaNuOverNu: 1.08e-8 }), { lastKept: glitch() });
    const grown = eventChanges([glitch({ deltaNuOverNu: 1.12e-8 })], [drifted]);
    expect(grown.kept).toMatchObject([{ revision: 2, what: 'Δν/ν 1.00e-8 → 1.12e-8' }]);
  });

  test('an id that moved with the epoch continues its record', () => {
    const moved = glitch({ id: 'kr-1-b', epochMjd: 60003, epochInterval95: [60002.5, 60003.5] });
    const { kept, dropped } = eventChanges([moved], [record(glitch())]);
    expect(kept).toMatchObject([{ event: { id: 'kr-1-b' }, before: { event: { id: 'kr-1-a' } }, revision: 2 }]);
    expect(dropped).toEqual([]);
  });

  test('the nearest record is continued, one that has its own id is not taken', () => {
    const second = glitch({ id: 'kr-1-c', epochMjd: 60004, epochInterval95: [60003, 60005] });
    const moved = glitch({ id: 'kr-1-d', epochMjd: 60004.5, epochInterval95: [60004, 60005] });
    const { kept } = eventChanges([glitch(), moved], [record(glitch()), record(second)]);
    expect(kept.map((k) => [k.event.id, k.before?.event.id])).toEqual([['kr-1-d', 'kr-1-c']]);
  });

  test('another pulsar or another time is another event', () => {
    const other = glitch({ id: 'kr-2-a', pulsar: 'KR 2', pulsars: ['KR 2'] });
    const later = glitch({ id: 'kr-1-z', epochMjd: 60100, epochInterval95: [60099, 60101] });
    const { kept } = eventChanges([glitch(), other, later], [record(glitch())]);
    expect(kept.map((k) => k.before)).toEqual([null, null]);
  });

  test('what the log no longer supports vanishes when nobody knew of it', () => {
    expect(eventChanges([], [record(glitch(), { told: false })])).toEqual({
      kept: [],
      dropped: ['kr-1-a'],
    });
  });

  test('and is withdrawn, once, when somebody did', () => {
    const { kept, dropped } = eventChanges([], [record(glitch(), { revision: 3 })]);
    expect(dropped).toEqual([]);
    expect(kept).toMatchObject([{ event: { state: 'withdrawn' }, revision: 4 }]);
    expect(eventChanges([], [record(glitch({ state: 'withdrawn' }))]).kept).toEqual([]);
  });

  test('a withdrawal says which site event explains it', () => {
    const clock = glitch({
      id: 'site-a',
      site: 'ridge',
      explanation: 'clock step',
      pulsars: ['KR 1', 'KR 2'],
      timeStepUs: 900,
      timeStepUsInterval68: [890, 910],
    });
    const { kept } = eventChanges([clock], [record(glitch())]);
    expect(kept.map((k) => k.what)).toEqual([
      'confirmed as clock step',
      'confirmed → withdrawn: explained by the clock step at ridge (event site-a)',
    ]);
  });

  test('a verdict on record is no change of what the detector holds', () => {
    const judged = record({ ...glitch(), state: 'accepted' }, { detectorState: 'confirmed' });
    expect(eventChanges([glitch()], [judged])).toEqual({ kept: [], dropped: [] });
    const gone = eventChanges([], [judged]).kept;
    expect(gone).toMatchObject([{ event: { state: 'withdrawn' }, revision: 2 }]);
  });

  test('an event that comes back continues its record', () => {
    const { kept } = eventChanges([glitch()], [record(glitch({ state: 'withdrawn' }), { revision: 4 })]);
    expect(kept).toMatchObject([{ revision: 5, what: 'withdrawn → confirmed' }]);
  });
});

describe('what is worth a revision', () => {
  test.each([
    [{ state: 'suspected' }, 'confirmed → suspected'],
    [{ explanation: 'slow spin-up' }, 'explanation glitch → slow spin-up'],
    [{ deltaNuOverNu: -2e-8 }, 'Δν/ν 1.00e-8 → -2.00e-8'],
    [{ deltaNuOverNuInterval68: [0.95e-8, 1.05e-8] }, 'Δν/ν interval narrowed by 50 %'],
    [{ deltaNuDot: -1e-15, deltaNuDotInterval68: [-2e-15, 0] }, 'Δν̇ -1.00e-15 Hz/s'],
    [
      {
        recovery: {
          terms: [
            { fraction: 0.1, fractionInterval68: [0, 0.2], timescaleDays: 20, timescaleDaysInterval68: [10, 30] },
          ],
          q: 0.1,
        },
      },
      'recovery with 1 timescale',
    ],
    [{ pulsars: ['KR 1', 'KR 2'] }, 'seen in KR 2 too'],
  ] as [Partial<PulsarEvent>, string][])('%o', (change, words) => {
    expect(changeInWords(glitch(), glitch(change))).toBe(words);
  });

  test('a size within its interval of zero may change its sign unnoticed', () => {
    const near = { deltaNuDot: 1e-17, deltaNuDotInterval68: [-1e-15, 1e-15] } as const;
    expect(changeInWords(glitch(near), glitch({ ...near, deltaNuDot: -1e-17 }))).toBeNull();
  });
});

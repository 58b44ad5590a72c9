import { uniformFloat64 } from 'pure-rand/distribution/uniformFloat64';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import type { ArrivalOrigin, EventRecord, FileRecord } from '../../daemon/records.ts';
import type {
  OutboxLine,
  PulsarOverview,
  ReviewDesk,
  VerdictOrder,
  VerdictOutcome,
  VitalSigns,
} from '../../daemon/review/desk.ts';
import type { EventPlan } from '../../detectors/plan/plan.ts';
import type { RecentArrivals } from '../../detectors/report.ts';
import type { EventPicture, EventState, PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';

/** A desk in memory with one evening of an invented observatory; every text of it can be replaced by a hostile one. */

export const NOW = new Date('2026-12-01T04:22:10Z');
const EPOCH = 61_370.41;

export function sampleEvent(change: Partial<PulsarEvent> = {}): PulsarEvent {
  return {
    id: 'kr-0417-61370',
    pulsar: 'KR 0417+31',
    state: 'confirmed',
    explanation: 'glitch',
    explanations: { glitch: 0.9983, 'slow spin-up': 0.0011, wandering: 0.0004, 'clock step': 0.0002 },
    epochMjd: EPOCH,
    epochInterval68: [EPOCH - 0.31, EPOCH + 0.39],
    epochInterval95: [EPOCH - 0.6, EPOCH + 0.8],
    deltaNuHz: 1.08e-7,
    deltaNuHzInterval68: [1.05e-7, 1.11e-7],
    deltaNuHzInterval95: [1.02e-7, 1.14e-7],
    deltaNuOverNu: 1.702e-8,
    deltaNuOverNuInterval68: [1.655e-8, 1.75e-8],
    deltaNuDot: -1.1e-15,
    deltaNuDotInterval68: [-1.6e-15, -6e-16],
    deltaNuDotOverNuDot: 2.7e-3,
    deltaNuDotOverNuDotInterval68: [1.5e-3, 3.9e-3],
    timeStepUs: null,
    timeStepUsInterval68: null,
    recovery: {
      terms: [
        { fraction: 0.021, fractionInterval68: [0.014, 0.03], timescaleDays: 18, timescaleDaysInterval68: [12, 27] },
      ],
      q: 0.021,
    },
    aliases: [
      { deltaNuHz: 1.08e-7, probability: 0.991 },
      { deltaNuHz: 1.167e-5, probability: 0.009 },
    ],
    firstArrivalMjd: EPOCH + 0.4,
    suspectedAtMjd: EPOCH + 0.4,
    confirmedAtMjd: EPOCH + 3.4,
    arrivalsUsed: 142,
    logBayesFactor: 31.2,
    falseAlertsPerYearAtThisLevel: 2e-9,
    pulsars: ['KR 0417+31'],
    site: null,
    ...change,
  };
}

/** Arrivals every third day for 200 days, with a spin-up of 1.08e-7 Hz at the epoch and seeded measurement noise. */
export function samplePicture(): EventPicture {
  const random = xoroshiro128plus(417);
  const noise = () => [1, 2, 3, 4].reduce((sum) => sum + uniformFloat64(random) - 0.5, 0) * Math.sqrt(3);
  const step = 1.08e-7;
  const deviation = (mjd: number) => (mjd < EPOCH ? 0 : -step * (mjd - EPOCH) * 86_400);
  const days = Array.from({ length: 68 }, (_, i) => EPOCH - 140.6 + 3 * i + 0.2 * uniformFloat64(random));
  return {
    points: days.map((mjd, i) => ({
      key: `a${i}`,
      mjd,
      deviationTurns: deviation(mjd) + 6e-3 * noise() + (i === 20 ? 0.04 : 0),
      uncertaintyTurns: 6e-3,
      used: i !== 20,
    })),
    fit: days.map((mjd) => ({ mjd, deviationTurns: deviation(mjd) })),
    frequencyTrack: Array.from({ length: 16 }, (_, i) => {
      const mjd = EPOCH - 135 + 12.4 * i;
      return { mjd, deltaNuHz: (mjd < EPOCH ? 0 : step) + 8e-9 * noise(), uncertaintyHz: 8e-9 };
    }),
    frequencyFit: [-135, -0.001, 0, 60].map((day) => ({ mjd: EPOCH + day, deltaNuHz: day < 0 ? 0 : step })),
    spinDownTrack: Array.from({ length: 12 }, (_, i) => {
      const mjd = EPOCH - 130 + 16 * i;
      return { mjd, deltaNuDot: (mjd < EPOCH ? 0 : -1.1e-15) + 9e-16 * noise(), uncertainty: 9e-16 };
    }),
    spinDownFit: [-135, -0.001, 0, 60].map((day) => ({ mjd: EPOCH + day, deltaNuDot: day < 0 ? 0 : -1.1e-15 })),
    epochMjd: EPOCH,
    epochInterval68: [EPOCH - 0.31, EPOCH + 0.39],
    frequencyHz: 6.3417701123349,
  };
}

export function sampleRecord(change: Partial<PulsarEvent> = {}): EventRecord {
  const event = sampleEvent(change);
  const suspected = { ...event, state: 'suspected' as const, arrivalsUsed: 139, explanations: { glitch: 0.71 } };
  return {
    event,
    detectorState: event.state,
    lastKept: event,
    revision: 2,
    told: event.state === 'confirmed',
    createdAt: '2026-11-28T05:10:00.000Z',
    changedAt: '2026-12-01T03:58:00.000Z',
    formerIds: [],
    picture: samplePicture(),
    history: [
      { revision: 1, at: '2026-11-28T05:10:00.000Z', what: 'suspected', event: suspected },
      { revision: 2, at: '2026-12-01T03:58:00.000Z', what: 'confirmed', event },
    ],
    verdicts: [],
  };
}

export interface MemoryDesk extends ReviewDesk {
  /** Replaces or adds a record, as the pipeline would. */
  put(record: EventRecord): void;
  verdictCount(): number;
}

/** Two candidates, the more credible first, and one that is suspected. */
export function oneEvening(): MemoryDesk {
  return memoryDesk([
    sampleRecord(),
    sampleRecord({ id: 'weaker', pulsar: 'KR 1118+62', logBayesFactor: 14.2 }),
    sampleRecord({ id: 'faint', pulsar: 'KR 2210-05', state: 'suspected', logBayesFactor: 3.1 }),
  ]);
}

export interface DeskTexts {
  readonly file?: string;
  readonly reason?: string;
  readonly subject?: string;
  readonly problem?: string;
}

export function memoryDesk(records: readonly EventRecord[] = [sampleRecord()], texts: DeskTexts = {}): MemoryDesk {
  const byId = new Map(records.map((record) => [record.event.id, record]));
  const all = () => [...byId.values()];
  const inState = (...states: EventState[]) => all().filter(({ event }) => states.includes(event.state));
  const quarantine = [
    {
      feed: 'north dish',
      file: texts.file ?? '2026-11/night-30.csv',
      line: 17,
      reason: texts.reason ?? 'uncertainty_us is not a number: "n/a"',
      at: '2026-12-01T03:57:00.000Z',
    },
  ];
  return {
    version: () => JSON.stringify(all().map(({ event, revision }) => [event.id, revision])),
    marks: () => ({
      events: JSON.stringify(all().map(({ event, revision }) => [event.id, revision])),
      files: '',
      mail: '',
      health: '',
    }),
    events: all,
    decisions: (most) =>
      inState('accepted', 'rejected', 'withdrawn')
        .map(({ event, changedAt, verdicts }) => ({ event, at: changedAt, verdict: verdicts.at(-1) ?? null }))
        .slice(0, most),
    event: (id) => byId.get(id) ?? null,
    origins: ({ picture }) => sampleOrigins(picture, texts),
    plan: ({ event }) => samplePlan(event),
    notice: (id) => (byId.has(id) ? '<?xml version="1.0"?><notice/>\n' : null),
    morning: () => ({
      observatory: 'Kestrel Ridge',
      date: '2026-12-01',
      since: '2026-11-30T08:00:00.000Z',
      until: NOW.toISOString(),
      waiting: inState('confirmed').map(({ event }) => event),
      suspected: inState('suspected').map(({ event }) => event),
      changed: [],
      quarantined: quarantine,
      silentFeeds: [{ feed: 'south dish', hoursSilent: 41, expectedHours: 24 }],
      silentPulsars: [],
      unlockedPulsars: ['KR 2210-05'],
      intake: { files: 3, arrivals: 128, pulsars: 41 },
      limits: [{ pulsar: 'KR 0417+31', deltaNuOverNu90: 2.1e-9, delayDays90: 6.5 }],
      falseAlerts: {
        budgetPerYear: 1,
        confirmed: 4,
        accepted: 2,
        rejected: 1,
        withdrawn: 0,
        falseInLastYear: 1,
        suspectedSteps: { up: 9, down: 3 },
        confirmedSteps: { up: 4, down: 0 },
      },
      heldBack: [],
      mail: { waiting: 1, oldestWaitingHours: 0.3, undelivered: [] },
      warnings: ['The leap-second table ends on 2027-06-28.'],
    }),
    pulsars: () => samplePulsars(),
    feeds: () => [
      {
        feed: 'north dish',
        lastFileAt: '2026-12-01T03:57:00.000Z',
        hoursSince: 0.42,
        expectEveryHours: 24,
        silent: false,
      },
      {
        feed: 'south dish',
        lastFileAt: '2026-11-29T11:20:00.000Z',
        hoursSince: 41,
        expectEveryHours: 24,
        silent: true,
      },
    ],
    files: () => [sampleFile(texts.file ?? '2026-11/night-30.csv')],
    quarantine: () => quarantine,
    outbox: () => [sampleMail(texts.subject ?? 'Kestrel Ridge: KR 0417+31: candidate glitch')],
    health: () => ({ ok: texts.problem === undefined, problems: texts.problem === undefined ? [] : [texts.problem] }),
    vitalSigns: () => sampleSigns(),
    metrics: () => '# EOF\n',
    recordVerdict: (order) => judge(byId, order),
    put: (record) => void byId.set(record.event.id, record),
    verdictCount: () => all().reduce((sum, { verdicts }) => sum + verdicts.length, 0),
  };
}

/** The night after the last arrival, and the ninth one, of a recovery that is established. */
export function samplePlan({ id, pulsar }: Pick<PulsarEvent, 'id' | 'pulsar'>): EventPlan {
  const widths = { deltaNuHz: 2e-9, deltaNuDotHzPerS: 4e-16, q: 0.004, timescaleDays: 3 };
  const asOfMjd = EPOCH + 60;
  return {
    pulsar,
    asOfMjd,
    lastArrivalMjd: asOfMjd,
    locked: true,
    count: { safeUntilMjd: asOfMjd + 90, safeDays: 90 },
    aliases: null,
    suspicion: null,
    recovery: {
      event: id,
      q: 0.021,
      timescaleDays: 18,
      assumed: false,
      now: { ...widths, q: 0.008, timescaleDays: 7 },
      schedules: [{ name: 'front-loaded', nights: 9, widths }],
      recommended: 'front-loaded',
      nights: [
        { mjd: asOfMjd + 0.9, widths: { ...widths, q: 0.007 } },
        { mjd: asOfMjd + 27.8, widths },
      ],
    },
  };
}

/** As the store has them: the file's text in every field that a file can fill. */
function sampleOrigins(picture: EventPicture | null, { file, reason }: DeskTexts): ArrivalOrigin[] {
  return (picture?.points ?? []).map(({ key, mjd }, i) => ({
    key,
    timeText: `${mjd.toFixed(8)}0417`,
    timeScale: 'UTC',
    site: 'north',
    receiver: reason ?? 'wide',
    frequencyMhz: 1400,
    uncertaintyUs: 950,
    status: 'live',
    feed: 'north dish',
    file: file ?? `2026/night-${i}.csv`,
    line: 2 + i,
    takenInAt: '2026-12-01T03:57:00.000Z',
  }));
}

/** Thirty arrivals that wander a little, a week apart. */
function sampleRecent(seed: number): RecentArrivals {
  const random = xoroshiro128plus(seed);
  const points = Array.from({ length: 30 }, (_, i) => {
    const turns = 4e-3 * Math.sin(i / 5 + seed) + 3e-3 * (uniformFloat64(random) - 0.5);
    return [7 * (i - 29), turns, 1e-3, i !== 11] as const;
  });
  return { points, everyDays: 7 };
}

export function samplePulsar(change: Partial<PulsarOverview> = {}): PulsarOverview {
  const pulsar = change.pulsar ?? 'KR 0417+31';
  return {
    pulsar,
    lastArrivalMjd: EPOCH + 3.4,
    locked: true,
    deltaNuOverNu90: 2.1e-9,
    delayDays90: 6.5,
    limitReason: null,
    state: 'watched',
    eventId: null,
    arrivals: 142,
    noise: { phaseWalk: 0, frequencyWalk: 1e-12, torqueWalk: 0, uncertaintyScale: 1.12, floorTurns: 0 },
    frequencyHz: 6.3417701123349,
    recent: sampleRecent(pulsar.length),
    ...change,
  };
}

function samplePulsars(): PulsarOverview[] {
  return [
    samplePulsar({ state: 'candidate', eventId: 'kr-0417-61370' }),
    samplePulsar({ pulsar: 'KR 1118+62', lastArrivalMjd: EPOCH + 3.3, deltaNuOverNu90: 7.4e-10, delayDays90: 9 }),
    samplePulsar({
      pulsar: 'KR 2210-05',
      lastArrivalMjd: null,
      locked: false,
      deltaNuOverNu90: null,
      delayDays90: null,
      limitReason: 'no arrivals yet',
      state: 'nothing yet',
      arrivals: null,
      noise: null,
      recent: null,
    }),
  ];
}

function sampleSigns(): VitalSigns {
  return {
    versions: { program: '1.0.0', node: '20.20.2', sqlite: '3.53.2' },
    startedAt: '2026-11-28T04:00:00.000Z',
    recordBytes: 41_943_040,
    residentBytes: 180_355_072,
    stages: [
      { name: 'feed north dish', resting: false, secondsSinceProgress: 4, limitSeconds: 600, late: false },
      { name: 'mail', resting: false, secondsSinceProgress: 2400, limitSeconds: 1800, late: true },
      { name: 'decide', resting: true, secondsSinceProgress: 31, limitSeconds: 600, late: false },
    ],
    tables: [
      { name: 'leap seconds', endsMjd: 61_584, state: 'good' },
      { name: 'clock table of north', endsMjd: 61_300, state: 'ended' },
    ],
    heartbeats: [{ way: 'web', lastSentAt: '2026-12-01T03:40:00.000Z', trouble: 'held back: no progress: mail' }],
  };
}

function judge(byId: Map<string, EventRecord>, order: VerdictOrder): VerdictOutcome {
  const { eventId, expectedRevision, at, ...said } = order;
  const record = byId.get(eventId);
  if (record === undefined) return { kind: 'unknown' };
  const last = record.verdicts.at(-1);
  const repeated =
    last?.revision === expectedRevision &&
    record.revision === expectedRevision + 1 &&
    last.verdict === said.verdict &&
    last.by === said.by &&
    last.note === said.note;
  if (repeated) return { kind: 'ok' };
  if (record.revision !== expectedRevision)
    return { kind: 'conflict', message: 'The event changed since it was read.' };
  const state = ({ accept: 'accepted', reject: 'rejected', reopen: record.detectorState } as const)[said.verdict];
  const event = { ...record.event, state };
  const revision = record.revision + 1;
  byId.set(eventId, {
    ...record,
    event,
    revision,
    changedAt: at,
    history: [...record.history, { revision, at, what: `${state} by ${said.by}`, event }],
    verdicts: [...record.verdicts, { ...said, at, revision: expectedRevision }],
  });
  return { kind: 'ok' };
}

function sampleFile(path: string): FileRecord {
  return {
    id: 9,
    feed: 'north dish',
    path,
    sha256: 'a'.repeat(64),
    bytes: 8123,
    takenInAt: '2026-12-01T03:57:00.000Z',
    rows: 62,
    stored: 44,
    same: 17,
    revised: 0,
    quarantined: 1,
    fault: null,
  };
}

function sampleMail(subject: string): OutboxLine {
  return {
    id: 4,
    messageId: '<kr-0417-61370.2@kestrel.example>',
    recipient: 'duty@kestrel.example',
    subject,
    kind: 'event',
    eventId: 'kr-0417-61370',
    state: 'queued',
    attempts: 1,
    dueAt: '2026-12-01T04:30:00.000Z',
    lastError: 'the server answered 451 try later',
    tries: [
      { begunAt: '2026-12-01T03:58:02.000Z', outcome: `put off: the server answered 451 ${subject}` },
      { begunAt: '2026-12-01T04:22:02.000Z', outcome: null },
    ],
    possibleDuplicate: false,
    createdAt: '2026-12-01T03:58:00.000Z',
    mayLeaveAt: '2026-12-01T03:58:00.000Z',
    deliveredAt: null,
  };
}

import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import {
  type EventUpsert,
  emptyBatch,
  type IntakeBatch,
  type NewArrival,
  type NewFile,
  type NewMessage,
  openStore,
  type Store,
} from '../../../daemon/store/index.ts';
import type { EventPicture, PulsarEvent } from '../../../detectors/steps/pulsarEvent.ts';

/** Records of the invented observatory, small enough to read in a test. */

export const AT = '2026-03-01T06:00:00.000Z';
export const LATER = '2026-03-01T07:00:00.000Z';
export const NEXT_DAY = '2026-03-02T06:00:00.000Z';

/** A folder that the caller's `afterEach` removes. */
export function temporaryFolder(): { readonly path: string; remove(): void } {
  const path = mkdtempSync(join(tmpdir(), 'spinvigil-store-'));
  return { path, remove: () => rmSync(path, { recursive: true, force: true }) };
}

export function open(folder: string, mode: 'daemon' | 'reader' = 'daemon'): Store {
  const opened = openStore(folder, { mode });
  if (!opened.ok) throw new Error(`${opened.failure.kind}: ${opened.failure.message}`);
  return opened.store;
}

export function sampleArrival(n: number, changes: Partial<NewArrival['received']> = {}): NewArrival {
  return {
    key: `key-${String(n).padStart(6, '0')}`,
    line: n + 2,
    received: {
      pulsar: 'KR 0417+31',
      timeText: `${60_000 + n}.1234567890123456789`,
      timeScale: 'UTC',
      time: { day: 60_000 + n, fraction: 0.1234567890123457 },
      uncertaintyUs: 12.5,
      frequencyMhz: 1400,
      site: 'Kestrel Ridge',
      receiver: 'L-wide',
      pulseNumber: null,
      signalToNoise: null,
      note: null,
      ...changes,
    },
    barycentred: {
      tdb: { day: 60_000 + n, fraction: 0.1278901234567891 },
      delays: {
        clockS: 1.2e-6,
        tdbMinusTtS: 0.0011,
        roemerS: 312.75,
        shapiroS: 1.1e-5,
        dispersionS: 0.0874,
        orbitS: 0,
      },
      quality: 'ok',
      qualityReasons: [],
    },
    quality: 'ok',
    qualityReasons: [],
    revises: null,
  };
}

export function sampleFile(rows: number, changes: Partial<NewFile> = {}): NewFile {
  return {
    feed: 'nightly',
    path: 'night-1.csv',
    sha256: 'aa'.repeat(32),
    bytes: 1000,
    signature: '1000:1',
    rows,
    fault: null,
    ...changes,
  };
}

/** A file with arrivals `from` … `from + count - 1` and nothing else. */
export function fileBatch(from: number, count: number, changes: Partial<NewFile> = {}): IntakeBatch {
  const arrivals = Array.from({ length: count }, (_, i) => sampleArrival(from + i));
  return { ...emptyBatch(AT), file: sampleFile(count, changes), arrivals };
}

export function sampleEvent(changes: Partial<PulsarEvent> = {}): PulsarEvent {
  return {
    id: 'KR0417-60003',
    pulsar: 'KR 0417+31',
    state: 'confirmed',
    explanation: 'glitch',
    explanations: { glitch: 0.998, 'clock step': 0.002 },
    epochMjd: 60_002.6,
    epochInterval68: [60_002.4, 60_002.8],
    epochInterval95: [60_002.2, 60_003],
    deltaNuHz: 1.1e-7,
    deltaNuHzInterval68: [1e-7, 1.2e-7],
    deltaNuHzInterval95: [0.9e-7, 1.3e-7],
    deltaNuOverNu: 1.7e-8,
    deltaNuOverNuInterval68: [1.6e-8, 1.8e-8],
    deltaNuDot: null,
    deltaNuDotInterval68: null,
    deltaNuDotOverNuDot: null,
    deltaNuDotOverNuDotInterval68: null,
    timeStepUs: null,
    timeStepUsInterval68: null,
    recovery: { terms: [], q: null },
    aliases: [],
    firstArrivalMjd: 60_003.1,
    suspectedAtMjd: 60_003.1,
    confirmedAtMjd: 60_004.1,
    arrivalsUsed: 5,
    logBayesFactor: 31.2,
    falseAlertsPerYearAtThisLevel: 1e-9,
    pulsars: ['KR 0417+31'],
    site: null,
    ...changes,
  };
}

export const samplePicture: EventPicture = {
  points: [{ key: 'key-000000', mjd: 60_000.1, deviationTurns: 0.001, uncertaintyTurns: 0.0002, used: true }],
  fit: [{ mjd: 60_000.1, deviationTurns: 0.001 }],
  frequencyTrack: [],
  frequencyFit: [],
  epochMjd: 60_002.6,
  epochInterval68: [60_002.4, 60_002.8],
  frequencyHz: 6.34,
};

export function upsert(changes: Partial<EventUpsert> = {}, event: Partial<PulsarEvent> = {}): EventUpsert {
  return {
    event: sampleEvent(event),
    picture: samplePicture,
    formerId: null,
    revision: 1,
    change: 'confirmed as glitch',
    ...changes,
  };
}

export function sampleMessage(changes: Partial<NewMessage> = {}): NewMessage {
  return {
    messageId: '<KR0417-60003.1@kestrel-ridge.example>',
    kind: 'event',
    eventId: 'KR0417-60003',
    subject: 'Kestrel Ridge: KR 0417+31: candidate glitch',
    recipients: ['duty@kestrel-ridge.example', 'timing@kestrel-ridge.example'],
    inReplyTo: null,
    content: 'From: …\r\n\r\nA candidate, to be vetted before it is announced.',
    dueAt: AT,
    ...changes,
  };
}

/** A notice to one recipient. */
export function notice(n: number, changes: Partial<NewMessage> = {}): NewMessage {
  return sampleMessage({
    messageId: `<notice-${n}@kestrel-ridge.example>`,
    kind: 'notice',
    eventId: null,
    recipients: ['duty@kestrel-ridge.example'],
    ...changes,
  });
}

import type { Interval, PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import type { ListedEvent } from '../records.ts';

/**
 * What a new derivation of the events means for those on record. One physical event keeps one record for life: it is recognised by
 * its id, and where the derivation moved the id, by pulsar and epoch. Pure: the same lists give the same changes.
 */
export interface EventChanges {
  readonly kept: readonly KeptEvent[];
  /** Ids of records that the log no longer supports and that nobody was told of: as if they had never been. */
  readonly dropped: readonly string[];
}

export interface KeptEvent {
  readonly event: PulsarEvent;
  /** The record it continues; null: it is new. */
  readonly before: ListedEvent | null;
  readonly revision: number;
  /** What changed, in words; null: nothing worth a revision, only the last digits. */
  readonly what: string | null;
}

/** Epochs of one physical event may move by this much beyond their 95 % intervals when late arrivals come in, days. */
const EPOCH_SLACK_DAYS = 3;
/** Smaller changes of a size or of an interval's width are not worth a revision. */
const WORTH_KEEPING = 0.1;

/**
 * @param derived the published events as the log now gives them
 * @param recorded every event on record
 */
export function eventChanges(derived: readonly PulsarEvent[], recorded: readonly ListedEvent[]): EventChanges {
  const partner = pairUp(derived, recorded);
  const kept: KeptEvent[] = [];
  for (const event of derived) {
    const before = partner.get(event) ?? null;
    const change = before === null ? firstChange(event) : laterChange(before, event);
    if (change !== null) kept.push(change);
  }
  const continued = new Set(partner.values());
  const dropped: string[] = [];
  for (const record of recorded) {
    if (continued.has(record)) continue;
    if (!record.told) dropped.push(record.event.id);
    else if (record.detectorState !== 'withdrawn') kept.push(withdrawal(record, derived));
  }
  return { kept, dropped };
}

function firstChange(event: PulsarEvent): KeptEvent {
  return { event, before: null, revision: 1, what: `${event.state} as ${event.explanation}` };
}

function laterChange(before: ListedEvent, event: PulsarEvent): KeptEvent | null {
  const asDetected = { ...before.event, state: before.detectorState };
  if (JSON.stringify(asDetected) === JSON.stringify(event)) return null;
  // Measured from the last revision, so that small changes add up to one.
  const what = changeInWords(before.lastKept, event);
  return { event, before, revision: before.revision + (what === null ? 0 : 1), what };
}

function withdrawal(before: ListedEvent, derived: readonly PulsarEvent[]): KeptEvent {
  const event: PulsarEvent = { ...before.event, state: 'withdrawn' };
  const what = `${before.detectorState} → withdrawn: ${whyWithdrawn(event, derived)}`;
  return { event, before, revision: before.revision + 1, what };
}

function pairUp(derived: readonly PulsarEvent[], recorded: readonly ListedEvent[]): Map<PulsarEvent, ListedEvent> {
  const byId = new Map(recorded.map((record) => [record.event.id, record]));
  const pairs = new Map<PulsarEvent, ListedEvent>();
  for (const event of derived) {
    const record = byId.get(event.id);
    if (record !== undefined) pairs.set(event, record);
  }
  const taken = new Set(pairs.values());
  for (const event of derived) {
    if (pairs.has(event)) continue;
    const nearest = recorded
      .filter((record) => !taken.has(record) && mayBeTheSame(record.event, event))
      .sort((a, b) => epochDistance(a.event, event) - epochDistance(b.event, event))[0];
    if (nearest === undefined) continue;
    pairs.set(event, nearest);
    taken.add(nearest);
  }
  return pairs;
}

function mayBeTheSame(a: PulsarEvent, b: PulsarEvent): boolean {
  const sameObject = a.site === null ? b.site === null && a.pulsar === b.pulsar : a.site === b.site;
  return sameObject && overlap(a.epochInterval95, b.epochInterval95, EPOCH_SLACK_DAYS);
}

function overlap(a: Interval, b: Interval, slackDays: number): boolean {
  return a[0] - slackDays <= b[1] && b[0] - slackDays <= a[1];
}

function epochDistance(a: PulsarEvent, b: PulsarEvent): number {
  return Math.abs(a.epochMjd - b.epochMjd);
}

/** In words what is worth a revision between two versions of one event, or null. */
export function changeInWords(before: PulsarEvent, after: PulsarEvent): string | null {
  const words: string[] = [];
  if (before.state !== after.state) words.push(`${before.state} → ${after.state}`);
  if (before.explanation !== after.explanation) words.push(`explanation ${before.explanation} → ${after.explanation}`);
  words.push(
    ...quantityInWords(
      'Δν/ν',
      before.deltaNuOverNu,
      after.deltaNuOverNu,
      before.deltaNuOverNuInterval68,
      after.deltaNuOverNuInterval68,
    ),
    ...quantityInWords(
      'Δν̇',
      before.deltaNuDot,
      after.deltaNuDot,
      before.deltaNuDotInterval68,
      after.deltaNuDotInterval68,
      ' Hz/s',
    ),
    ...quantityInWords(
      'Δt',
      before.timeStepUs,
      after.timeStepUs,
      before.timeStepUsInterval68,
      after.timeStepUsInterval68,
      ' µs',
    ),
  );
  const terms = after.recovery.terms.length;
  if (terms !== before.recovery.terms.length) {
    words.push(
      terms === 0
        ? 'recovery no longer called for'
        : `recovery with ${terms} ${terms === 1 ? 'timescale' : 'timescales'}`,
    );
  }
  if (!overlap(before.epochInterval95, after.epochInterval95, 0)) {
    words.push(`epoch MJD ${before.epochMjd.toFixed(2)} → ${after.epochMjd.toFixed(2)}`);
  }
  const joined = after.pulsars.filter((pulsar) => !before.pulsars.includes(pulsar));
  if (joined.length > 0) words.push(`seen in ${joined.join(', ')} too`);
  return words.length === 0 ? null : words.join('; ');
}

function quantityInWords(
  name: string,
  before: number | null,
  after: number | null,
  beforeInterval: Interval | null,
  afterInterval: Interval | null,
  unit = '',
): string[] {
  if (before === null || after === null) {
    if (before === after) return [];
    return [after === null ? `${name} no longer stated` : `${name} ${rounded(after)}${unit}`];
  }
  const beforeWidth = width(beforeInterval);
  const afterWidth = width(afterInterval);
  // A size that is consistent with zero moves by large factors and means nothing by it: its change is judged on its interval too.
  const scale = Math.max(Math.abs(before), beforeWidth / 2);
  if (Math.abs(after - before) > WORTH_KEEPING * scale)
    return [`${name} ${rounded(before)} → ${rounded(after)}${unit}`];
  if (beforeWidth > 0 && Math.abs(afterWidth - beforeWidth) > WORTH_KEEPING * beforeWidth) {
    const change = Math.round(100 * (afterWidth / beforeWidth - 1));
    return [`${name} interval ${change < 0 ? 'narrowed' : 'widened'} by ${Math.abs(change)} %`];
  }
  return [];
}

/** Small numbers with their power of ten, others written out. */
function rounded(value: number): string {
  const digits = value.toPrecision(3);
  return Math.abs(value) >= 1e-3 ? String(Number(digits)) : digits;
}

function width(interval: Interval | null): number {
  return interval === null ? 0 : interval[1] - interval[0];
}

function whyWithdrawn(event: PulsarEvent, derived: readonly PulsarEvent[]): string {
  const site = derived.find(
    (other) =>
      other.site !== null &&
      other.pulsars.includes(event.pulsar) &&
      overlap(other.epochInterval95, event.epochInterval95, EPOCH_SLACK_DAYS),
  );
  if (site !== undefined) return `explained by the ${site.explanation} at ${site.site} (event ${site.id})`;
  return `the arrivals on record no longer call for it`;
}

import type { Explanation, Interval, PulsarEvent } from '../detectors/steps/pulsarEvent.ts';
import { type EventMailKind, messageId } from './messageId.ts';
import { isConstrained } from './wording/numbers.ts';

/**
 * Whom to tell, when, and why. Pure: the daemon calls `messagesFor` with every change of an event, queues what comes back in the
 * transaction that stores the change, and logs the reason, also when nothing is mailed.
 */

/** One change of an event, as the pipeline is about to store it. */
export interface EventChanged {
  /** The event as it stood on record; null: new. */
  readonly before: PulsarEvent | null;
  readonly after: PulsarEvent;
  readonly revision: number;
  /** What was mailed about this event so far; null: nothing. */
  readonly told: ToldBefore | null;
}

export interface ToldBefore {
  /** Of the first mail about the event: later ones thread under it. */
  readonly firstMessageId: string;
  /** The event as the last mail described it: an update is news against this, not against yesterday's revision. */
  readonly as: PulsarEvent;
  /** Whoever may have a copy of any mail about it. */
  readonly recipients: readonly string[];
}

export interface AlertPolicy {
  readonly to: readonly string[];
  /** From the pulsar's own `[alerts]`, and those who asked for events of its kind. */
  readonly extraRecipients: readonly string[];
  /** The observatory's contact address: its domain ends every Message-ID. */
  readonly contact: string;
  readonly nowMjd: number;
  /** An event confirmed by an arrival older than this waits for the digest instead of waking anyone. */
  readonly historicalDays: number;
  /** An update is mailed when a 68 % interval has shrunk by this factor since the last mail. */
  readonly sharperBy: number;
  /** Suspected events are mailed too, because the operator asked for it; absent: they are not. */
  readonly mailSuspected?: boolean;
}

export const DEFAULT_HISTORICAL_DAYS = 30;

/** An update is mailed when a 68 % interval has shrunk by this factor since the last mail, unless the operator set another. */
export const DEFAULT_SHARPER_BY = 2;

export type AlertReason =
  // these are mailed
  | 'first suspicion'
  | 'confirmed after suspicion'
  | 'first confirmation'
  | 'confirmed again'
  | 'withdrawn after it was told'
  | 'explanation changed'
  | 'recovery first established'
  | 'alias fell'
  | 'size sharpened'
  | 'epoch sharpened'
  | 'spin-down step sharpened'
  | 'recovery sharpened'
  // these are not
  | 'suspected only'
  | 'in the digest only'
  | 'historical'
  | 'withdrawn before it was told'
  | 'verdict'
  | 'nothing new';

export interface PlannedMessage {
  readonly kind: EventMailKind;
  readonly reason: AlertReason;
  readonly eventId: string;
  readonly revision: number;
  readonly messageId: string;
  /** Null: this is the first message of the event. */
  readonly inReplyTo: string | null;
  readonly recipients: readonly string[];
}

export interface AlertDecision {
  readonly reason: AlertReason;
  /** Empty: nobody is woken; page and digest show the event anyway. */
  readonly messages: readonly PlannedMessage[];
}

/** Confirmed events of these kinds say something about the data, not the pulsar: page and digest show them, no mail does. */
const DIGEST_ONLY: ReadonlySet<Explanation> = new Set(['bad arrival', 'bad session', 'lost count']);

export function messagesFor(change: EventChanged, policy: AlertPolicy): AlertDecision {
  const reason = reasonFor(change, policy);
  const kind = MAIL_KIND[reason];
  if (kind === null) return { reason, messages: [] };
  const { after, revision, told } = change;
  const id = messageId({ eventId: after.id, revision, kind, contact: policy.contact });
  const recipients = recipientsOf(kind, reason, change, policy);
  if (recipients.length === 0) return { reason, messages: [] };
  const message = { kind, reason, eventId: after.id, revision, messageId: id, recipients };
  return { reason, messages: [{ ...message, inReplyTo: told?.firstMessageId ?? null }] };
}

/** A withdrawal goes to whoever heard what it takes back, whatever the configuration says by now, and to nobody else. */
function recipientsOf(
  kind: EventMailKind,
  reason: AlertReason,
  { told }: EventChanged,
  { to, extraRecipients }: AlertPolicy,
): readonly string[] {
  const heard = told?.recipients ?? [];
  if (kind === 'withdrawal') return heard;
  const corrected = reason === 'explanation changed' ? heard : [];
  return [...new Set([...to, ...extraRecipients, ...corrected])];
}

const MAIL_KIND: Readonly<Record<AlertReason, EventMailKind | null>> = {
  'first suspicion': 'first',
  'confirmed after suspicion': 'update',
  'first confirmation': 'first',
  'confirmed again': 'update',
  'withdrawn after it was told': 'withdrawal',
  'explanation changed': 'update',
  'recovery first established': 'update',
  'alias fell': 'update',
  'size sharpened': 'update',
  'epoch sharpened': 'update',
  'spin-down step sharpened': 'update',
  'recovery sharpened': 'update',
  'suspected only': null,
  'in the digest only': null,
  historical: null,
  'withdrawn before it was told': null,
  verdict: null,
  'nothing new': null,
};

function reasonFor(change: EventChanged, policy: AlertPolicy): AlertReason {
  const { before, after, told } = change;
  if (after.state === 'rejected' || (after.state === 'accepted' && before?.state !== 'accepted')) return 'verdict';
  if (told === null) return firstReason(after, policy);
  if (after.state === 'withdrawn') return told.as.state === 'withdrawn' ? 'nothing new' : 'withdrawn after it was told';
  if (after.state === 'suspected') return 'suspected only';
  if (told.as.state === 'withdrawn') return 'confirmed again';
  if (told.as.state === 'suspected') return 'confirmed after suspicion';
  if (told.as.explanation !== after.explanation) return 'explanation changed';
  if (told.as.recovery.terms.length === 0 && after.recovery.terms.length > 0) return 'recovery first established';
  if (plausibleSizes(after) < plausibleSizes(told.as)) return 'alias fell';
  return whatSharpened(told.as, after, policy.sharperBy) ?? 'nothing new';
}

function firstReason(after: PulsarEvent, policy: AlertPolicy): AlertReason {
  if (after.state === 'suspected' && policy.mailSuspected !== true) return 'suspected only';
  if (after.state === 'withdrawn') return 'withdrawn before it was told';
  if (DIGEST_ONLY.has(after.explanation)) return 'in the digest only';
  const confirmedAt = after.confirmedAtMjd ?? after.suspectedAtMjd;
  if (policy.nowMjd - confirmedAt > policy.historicalDays) return 'historical';
  if (after.state === 'accepted') return 'verdict';
  return after.state === 'suspected' ? 'first suspicion' : 'first confirmation';
}

/** Step sizes that differ by whole turns between arrivals, and are worth a thought. */
function plausibleSizes({ aliases }: PulsarEvent): number {
  return aliases.filter(({ probability }) => probability >= 0.01).length;
}

type Quantity = readonly [value: number | null, interval68: Interval | null];

/** What is known by so much better than when it was told; a quantity whose sign is not known yet says nothing. */
function whatSharpened(told: PulsarEvent, now: PulsarEvent, factor: number): AlertReason | null {
  const sharper = (was: Quantity, is: Quantity) =>
    isConstrained(...is) && was[1] !== null && is[1] !== null && width(was[1]) >= factor * width(is[1]);
  const some = (quantity: (event: PulsarEvent) => Quantity) => sharper(quantity(told), quantity(now));
  if (some((e) => [e.deltaNuHz, e.deltaNuHzInterval68]) || some((e) => [e.timeStepUs, e.timeStepUsInterval68])) {
    return 'size sharpened';
  }
  if (some((e) => [e.deltaNuDot, e.deltaNuDotInterval68])) return 'spin-down step sharpened';
  const terms = now.recovery.terms.length === told.recovery.terms.length ? now.recovery.terms : [];
  const recovery = terms.some((is, i) => {
    const was = told.recovery.terms[i]!;
    return (
      sharper([was.fraction, was.fractionInterval68], [is.fraction, is.fractionInterval68]) ||
      sharper([was.timescaleDays, was.timescaleDaysInterval68], [is.timescaleDays, is.timescaleDaysInterval68])
    );
  });
  if (recovery) return 'recovery sharpened';
  return some((e) => [e.epochMjd, e.epochInterval68]) ? 'epoch sharpened' : null;
}

function width([low, high]: Interval): number {
  return high - low;
}

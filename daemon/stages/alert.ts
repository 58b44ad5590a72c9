import {
  type Belief,
  type ComposedMessage,
  composeEventMail,
  composeStormNotice,
  type EventMail,
  isQuiet,
  mailOrSummary,
  mayWake,
  messagesFor,
} from '../../alerts/index.ts';
import type { EventPicture, PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import { civilTime, instantOf, mjdOf } from '../clock.ts';
import type { OutboxRecord } from '../records.ts';
import { mailSetting, type Station } from '../station.ts';
import type { NewMessage } from '../store/index.ts';
import type { KeptEvent } from './eventChanges.ts';
import { HELD, MAILED, NOT_MAILED, PAGE_ONLY, SUMMARY_ONLY } from './mailVerdict.ts';
import { type Mailed, mailedSoFar, NOTHING_MAILED } from './told.ts';

export interface Alerts {
  readonly messages: readonly NewMessage[];
  /** Message-IDs of mail that still waits and that this replaces. */
  readonly superseded: readonly string[];
  /** Event id → in words, whether its change is mailed and why, for its history. */
  readonly why: ReadonlyMap<string, string>;
}

/** Decides for each changed event whether anybody is told, and writes the mail. Every decision is logged with its reason. */
export async function planAlerts(
  station: Station,
  changes: readonly KeptEvent[],
  pictureOf: (event: PulsarEvent) => EventPicture | null,
): Promise<Alerts> {
  const messages: NewMessage[] = [];
  const superseded: string[] = [];
  const why = new Map<string, string>();
  const storms: Storms = new Map();
  for (const change of changes) {
    if (change.what === null) continue;
    const mailed = change.before === null ? NOTHING_MAILED : mailedSoFar(station, change.before.event.id);
    const after = shown(change);
    const decision = messagesFor(
      { before: change.before?.event ?? null, after, revision: change.revision, told: mailed.told },
      policyFor(station, after),
    );
    const facts = { event: after.id, revision: change.revision, state: after.state, change: change.what };
    station.log.info({ ...facts, alert: decision.reason, mails: decision.messages.length }, 'event changed');
    const history = beliefs(station, change, after);
    let outcome = NOT_MAILED;
    for (const planned of decision.messages) {
      const mail = { event: after, planned, picture: pictureOf(after), toldRevision: mailed.toldRevision, history };
      const composed = await composeWithin(station, mail, { storms, mailed });
      if (composed.message !== null) messages.push(composed.message);
      outcome = composed.verdict;
    }
    why.set(after.id, `${outcome}: ${decision.reason}`);
    // In a storm the older mail is better than none.
    const isReplaced = messages.some(({ eventId }) => eventId === after.id);
    if (isReplaced || after.state === 'withdrawn') superseded.push(...mailed.unsent);
  }
  return { messages, superseded, why };
}

/** A standing verdict is what people see, whatever the detector goes on to find. */
function shown({ event, before }: KeptEvent): PulsarEvent {
  const judged = before !== null && before.event.state !== before.detectorState;
  return judged ? { ...event, state: before.event.state } : event;
}

function policyFor(station: Station, event: PulsarEvent) {
  const { configuration, clock } = station;
  const { mail } = configuration;
  const ownRecipients = event.pulsars.flatMap(
    (pulsar) => configuration.models.get(pulsar)?.alerts.extraRecipients ?? [],
  );
  const wanted = mail.alsoTo.filter(
    ({ explanations, pulsars }) =>
      (explanations.length === 0 || explanations.includes(event.explanation)) &&
      (pulsars.length === 0 || pulsars.some((pulsar) => event.pulsars.includes(pulsar))),
  );
  return {
    to: mail.to,
    extraRecipients: [...ownRecipients, ...wanted.flatMap(({ to }) => to)],
    contact: configuration.observatory.contact,
    nowMjd: mjdOf(clock.now()),
    historicalDays: mail.historicalAfterDays,
    sharperBy: mail.updateWhenSharperBy,
    mailSuspected: mail.mailSuspected,
  };
}

/** The end of the quiet hours that hold this event's mail; null: it may leave now. */
function heldUntil({ configuration, clock }: Station, event: PulsarEvent, told: PulsarEvent | null): Date | null {
  const { quietHours, timezone } = configuration.mail;
  if (quietHours === null) return null;
  const now = clock.now();
  const wall = civilTime(now, timezone);
  if (!isQuiet(wall.time, quietHours) || mayWake(event, told, quietHours)) return null;
  const isToday = wall.time < quietHours.until;
  const date = isToday ? wall.date : new Date(Date.parse(`${wall.date}T12:00:00Z`) + DAY_MS).toISOString().slice(0, 10);
  return instantOf({ date, time: `${quietHours.until}:00` }, timezone);
}

interface Storm {
  eventMails: number;
  summarySent: boolean;
}

const HOUR_MS = 3_600_000;
const DAY_MS = 86_400_000;
const STORM_NOTICE = 'storm';

/** What may leave in the hour up to a time. Mail that was held all night leaves in one hour, and counts as of that hour. */
function stormBefore({ store }: Station, at: Date): Storm {
  const since = new Date(at.getTime() - HOUR_MS).toISOString();
  const recent = store.outbox({ mayLeaveSince: since }).filter(({ mayLeaveAt }) => mayLeaveAt <= at.toISOString());
  const messages = (kind: OutboxRecord['kind']) =>
    new Set(recent.filter((copy) => copy.kind === kind).map((copy) => copy.messageId));
  return {
    eventMails: messages('event').size,
    summarySent: [...messages('notice')].some((id) => id.startsWith(`<notice.${STORM_NOTICE}.`)),
  };
}

/** The storms of this batch, by the time at which its mail may leave. */
type Storms = Map<string, Storm>;

function stormOf(station: Station, storms: Storms, leavesAt: Date): Storm {
  const key = leavesAt.toISOString();
  const known = storms.get(key) ?? stormBefore(station, leavesAt);
  storms.set(key, known);
  return known;
}

async function composeWithin(
  station: Station,
  mail: Omit<EventMail, 'model'>,
  { storms, mailed }: { readonly storms: Storms; readonly mailed: Mailed },
): Promise<{ readonly message: NewMessage | null; readonly verdict: string }> {
  const { planned, event } = mail;
  const setting = mailSetting(station);
  const held = heldUntil(station, event, mailed.told?.as ?? null);
  const leavesAt = held ?? setting.now;
  const storm = stormOf(station, storms, leavesAt);
  // It takes the place of those that it replaces.
  const others = Math.max(0, storm.eventMails - mailed.unsent.length);
  const recent = { eventMails: others, summarySent: storm.summarySent };
  const verdict = mailOrSummary(planned, recent, station.configuration.mail.mostPerHour);
  if (verdict === 'page only') return { message: null, verdict: PAGE_ONLY };
  if (verdict === 'summary') {
    storm.summarySent = true;
    const hour = leavesAt
      .toISOString()
      .slice(0, 13)
      .replace(/[^0-9]/g, '');
    const notice = { name: `${STORM_NOTICE}.${hour}`, mailedInTheHour: storm.eventMails };
    const composed = await composeStormNotice(notice, planned.recipients, setting);
    return { message: newMessage(composed, null, leavesAt), verdict: SUMMARY_ONLY };
  }
  storm.eventMails = others + 1;
  const model = station.configuration.models.get(event.pulsar) ?? null;
  const composed = await composeEventMail({ ...mail, model }, setting);
  const said = held === null ? MAILED : `${HELD} until ${station.configuration.mail.quietHours?.until}`;
  return { message: newMessage(composed, planned.inReplyTo, leavesAt), verdict: said };
}

/** What was believed when, this change included, for the mail about it. */
function beliefs({ store, clock }: Station, { before, revision, what }: KeptEvent, after: PulsarEvent): Belief[] {
  const earlier = before === null ? [] : (store.event(before.event.id)?.history ?? []);
  return [...earlier, { revision, at: clock.now().toISOString(), what: what ?? '', event: after }];
}

/** A composed message as the outbox keeps it: one character a byte. */
export function newMessage(composed: ComposedMessage, inReplyTo: string | null, dueAt: Date): NewMessage {
  const { messageId, kind, eventId, subject, recipients, mime } = composed;
  return {
    messageId,
    kind,
    eventId,
    subject,
    recipients,
    inReplyTo,
    content: mime.toString('latin1'),
    dueAt: dueAt.toISOString(),
  };
}

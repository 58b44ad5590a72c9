import {
  type ComposedMessage,
  composeEventMail,
  composeStormNotice,
  type EventMail,
  mailOrSummary,
  messagesFor,
  type ToldBefore,
} from '../../alerts/index.ts';
import type { EventPicture, PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import { mjdOf } from '../clock.ts';
import type { EventChange, OutboxRecord } from '../records.ts';
import { mailSetting, type Station } from '../station.ts';
import type { NewMessage } from '../store/index.ts';
import type { KeptEvent } from './eventChanges.ts';

export interface Alerts {
  readonly messages: readonly NewMessage[];
  /** Message-IDs of mail that still waits and that this replaces. */
  readonly superseded: readonly string[];
}

/** Decides for each changed event whether anybody is told, and writes the mail. Every decision is logged with its reason. */
export async function planAlerts(
  station: Station,
  changes: readonly KeptEvent[],
  pictureOf: (event: PulsarEvent) => EventPicture | null,
): Promise<Alerts> {
  const messages: NewMessage[] = [];
  const superseded: string[] = [];
  const storm = stormWatch(station);
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
    for (const planned of decision.messages) {
      const mail = { event: after, planned, picture: pictureOf(after), toldRevision: mailed.toldRevision };
      const message = await composeWithin(station, mail, storm);
      if (message !== null) messages.push(message);
    }
    if (decision.messages.length > 0 || after.state === 'withdrawn') superseded.push(...mailed.unsent);
  }
  return { messages, superseded };
}

/** A standing verdict is what people see, whatever the detector goes on to find. */
function shown({ event, before }: KeptEvent): PulsarEvent {
  const judged = before !== null && before.event.state !== before.detectorState;
  return judged ? { ...event, state: before.event.state } : event;
}

function policyFor(station: Station, event: PulsarEvent) {
  const { configuration, clock } = station;
  return {
    to: configuration.mail.to,
    extraRecipients: event.pulsars.flatMap((pulsar) => configuration.models.get(pulsar)?.alerts.extraRecipients ?? []),
    contact: configuration.observatory.contact,
    nowMjd: mjdOf(clock.now()),
    historicalDays: configuration.mail.historicalAfterDays,
  };
}

interface Mailed {
  readonly told: ToldBefore | null;
  readonly toldRevision: number | null;
  /** Messages of which no attempt was made yet, to anybody. */
  readonly unsent: readonly string[];
}

const NOTHING_MAILED: Mailed = { told: null, toldRevision: null, unsent: [] };

/** What may have left about an event. Mail that only waits tells nobody: news replaces it. */
function mailedSoFar(station: Station, eventId: string): Mailed {
  const copies = station.store.outbox({ eventId, kind: 'event' });
  const left = new Set(copies.filter(mayHaveLeft).map((copy) => copy.messageId));
  const unsent = new Set(
    copies.filter((copy) => copy.state === 'queued' && !left.has(copy.messageId)).map((copy) => copy.messageId),
  );
  const sent = copies.filter((copy) => left.has(copy.messageId));
  const first = sent[0];
  const last = sent.at(-1);
  const described = last === undefined ? null : asDescribed(station.store.event(eventId)?.history ?? [], last);
  if (first === undefined || described === null) return { ...NOTHING_MAILED, unsent: [...unsent] };
  return {
    told: { firstMessageId: first.messageId, as: described.event },
    toldRevision: described.revision,
    unsent: [...unsent],
  };
}

function mayHaveLeft(copy: OutboxRecord): boolean {
  return copy.attempts > 0 || copy.state === 'delivered';
}

/** A revision and the mail about it are written in one transaction, with one time. */
function asDescribed(history: readonly EventChange[], mail: OutboxRecord): EventChange | null {
  const exact = history.find((change) => change.at === mail.createdAt);
  return exact ?? history.findLast((change) => change.at <= mail.createdAt) ?? history[0] ?? null;
}

interface Storm {
  eventMails: number;
  summarySent: boolean;
}

const HOUR_MS = 3_600_000;
const STORM_NOTICE = 'storm';

function stormWatch({ store, clock }: Station): Storm {
  const since = new Date(clock.now().getTime() - HOUR_MS).toISOString();
  const recent = store.outbox({ since });
  const messages = (kind: OutboxRecord['kind']) =>
    new Set(recent.filter((copy) => copy.kind === kind).map((copy) => copy.messageId));
  return {
    eventMails: messages('event').size,
    summarySent: [...messages('notice')].some((id) => id.startsWith(`<notice.${STORM_NOTICE}.`)),
  };
}

async function composeWithin(
  station: Station,
  mail: Omit<EventMail, 'model'>,
  storm: Storm,
): Promise<NewMessage | null> {
  const { planned, event } = mail;
  const verdict = mailOrSummary(planned, storm);
  if (verdict === 'page only') return null;
  const setting = mailSetting(station);
  if (verdict === 'summary') {
    storm.summarySent = true;
    const name = `${STORM_NOTICE}.${setting.now
      .toISOString()
      .slice(0, 13)
      .replace(/[^0-9]/g, '')}`;
    const notice = { name, mailedInTheHour: storm.eventMails };
    return newMessage(await composeStormNotice(notice, planned.recipients, setting), null, setting.now);
  }
  storm.eventMails += 1;
  const model = station.configuration.models.get(event.pulsar) ?? null;
  return newMessage(await composeEventMail({ ...mail, model }, setting), planned.inReplyTo, setting.now);
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

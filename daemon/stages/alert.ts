import {
  type Belief,
  type ComposedMessage,
  composeEventMail,
  composeStormNotice,
  type EventMail,
  mailOrSummary,
  messagesFor,
} from '../../alerts/index.ts';
import type { EventPicture, PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import { mjdOf } from '../clock.ts';
import type { OutboxRecord } from '../records.ts';
import { mailSetting, type Station } from '../station.ts';
import type { NewMessage } from '../store/index.ts';
import type { KeptEvent } from './eventChanges.ts';
import { mailedSoFar, NOTHING_MAILED } from './told.ts';

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
    const history = beliefs(station, change, after);
    let outcome: MailVerdict = 'not mailed';
    for (const planned of decision.messages) {
      const mail = { event: after, planned, picture: pictureOf(after), toldRevision: mailed.toldRevision, history };
      const composed = await composeWithin(station, mail, storm);
      if (composed.message !== null) messages.push(composed.message);
      outcome = composed.verdict;
    }
    why.set(after.id, `${outcome}: ${decision.reason}`);
    if (decision.messages.length > 0 || after.state === 'withdrawn') superseded.push(...mailed.unsent);
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
  return {
    to: configuration.mail.to,
    extraRecipients: event.pulsars.flatMap((pulsar) => configuration.models.get(pulsar)?.alerts.extraRecipients ?? []),
    contact: configuration.observatory.contact,
    nowMjd: mjdOf(clock.now()),
    historicalDays: configuration.mail.historicalAfterDays,
    sharperBy: configuration.mail.updateWhenSharperBy,
  };
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

type MailVerdict = 'mailed' | 'not mailed' | 'in the storm notice only' | 'on the page only, in a storm';

async function composeWithin(
  station: Station,
  mail: Omit<EventMail, 'model'>,
  storm: Storm,
): Promise<{ readonly message: NewMessage | null; readonly verdict: MailVerdict }> {
  const { planned, event } = mail;
  const verdict = mailOrSummary(planned, storm);
  if (verdict === 'page only') return { message: null, verdict: 'on the page only, in a storm' };
  const setting = mailSetting(station);
  if (verdict === 'summary') {
    storm.summarySent = true;
    const name = `${STORM_NOTICE}.${setting.now
      .toISOString()
      .slice(0, 13)
      .replace(/[^0-9]/g, '')}`;
    const notice = { name, mailedInTheHour: storm.eventMails };
    const composed = await composeStormNotice(notice, planned.recipients, setting);
    return { message: newMessage(composed, null, setting.now), verdict: 'in the storm notice only' };
  }
  storm.eventMails += 1;
  const model = station.configuration.models.get(event.pulsar) ?? null;
  const composed = await composeEventMail({ ...mail, model }, setting);
  return { message: newMessage(composed, planned.inReplyTo, setting.now), verdict: 'mailed' };
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

import { composeDigest, composeOperatorNotice, type MorningReview } from '../../alerts/index.ts';
import type { OutboxRecord } from '../records.ts';
import { newMessage } from '../stages/alert.ts';
import { mailSetting, type Station } from '../station.ts';

/** Mail that no event causes: the morning digest, and what the daemon has to say about itself. */

/** Queues the digest of a civil date, once for ever. */
export async function makeDigest(station: Station, date: string, review: MorningReview): Promise<void> {
  const setting = mailSetting(station);
  const composed = await composeDigest(review, station.configuration.mail.to, setting);
  station.store.commitDigest(date, newMessage(composed, null, setting.now), setting.now.toISOString());
}

const HEARTBEAT = 'heartbeat';

/** Queues a mail that says the watch lives; `false`: an earlier one still waits, and a second would say nothing more. */
export async function mailHeartbeat(station: Station, to: readonly string[]): Promise<boolean> {
  const { store } = station;
  const waiting = [
    ...store.outbox({ kind: 'notice', state: 'queued' }),
    ...store.outbox({ kind: 'notice', state: 'attempting' }),
  ];
  if (waiting.some(({ messageId }) => messageId.includes(`${HEARTBEAT}.`))) return false;
  const setting = mailSetting(station);
  const notice = {
    name: `${HEARTBEAT}.${setting.now.getTime()}`,
    subject: 'the watch is alive',
    paragraphs: [
      'Feeds are looked at, decisions are taken, mail leaves. This message comes at regular times; when it does not, look at the watch.',
    ],
  };
  const composed = await composeOperatorNotice(notice, to, setting);
  store.commitNotice(newMessage(composed, null, setting.now), setting.now.toISOString());
  return true;
}

/** Tells the operators what is wrong with the configuration that the daemon was told to take up. */
export async function reportBadReload(station: Station, problems: readonly string[]): Promise<void> {
  const { mail, observatory, file } = station.configuration;
  const setting = mailSetting(station);
  const notice = {
    name: `reload.${setting.now.getTime()}`,
    subject: 'the new configuration was not taken up',
    paragraphs: [
      `The watch was told to read ${file} again. It cannot be used, and the watch goes on with the configuration it had:`,
      ...problems,
      'Mend it, try it with “spinvigil check”, then reload again.',
    ],
  };
  const composed = await composeOperatorNotice(notice, [...new Set([...mail.to, observatory.contact])], setting);
  station.store.commitNotice(newMessage(composed, null, setting.now), setting.now.toISOString());
}

/** Tells the others that a recipient could not be reached. About a notice nobody is told: that could go on for ever. */
export async function reportGivenUp(
  station: Station,
  mail: OutboxRecord,
  state: 'refused' | 'expired',
  why: string,
): Promise<void> {
  if (mail.kind === 'notice') return;
  const { mail: orders, observatory } = station.configuration;
  const others = [...new Set([...orders.to, observatory.contact])].filter((address) => address !== mail.recipient);
  if (others.length === 0) return;
  const setting = mailSetting(station);
  const notice = {
    name: `${state}.${mail.id}`,
    subject: `mail to ${mail.recipient} was ${state === 'refused' ? 'refused' : 'not delivered'}`,
    paragraphs: [
      `“${mail.subject}” did not reach ${mail.recipient} after ${mail.attempts} ${mail.attempts === 1 ? 'attempt' : 'attempts'}: ${why}.`,
      'It is not tried again. Correct the address in the configuration, or tell that person in another way.',
    ],
  };
  const composed = await composeOperatorNotice(notice, others, setting);
  station.store.commitNotice(newMessage(composed, null, setting.now), setting.now.toISOString());
}

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

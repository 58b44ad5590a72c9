import { composeOperatorNotice, type MorningReview, timeInWords } from '../../alerts/index.ts';
import type { Configuration } from '../config/configuration.ts';
import { newMessage } from '../stages/alert.ts';
import { mailSetting, type Station } from '../station.ts';
import type { Store } from '../store/index.ts';

/** A feed that stopped is news: the last value on record would look alive for ever. */

/** Set at the first start: a feed that never delivered is silent from then on. */
export const FIRST_START = 'first_started_at';

const HOUR_MS = 3_600_000;

/** Feeds that delivered nothing for longer than `expect_every_hours`. */
export function silentFeeds(configuration: Configuration, store: Store, now: Date): MorningReview['silentFeeds'] {
  const lastFile = store.lastFileByFeed();
  return configuration.feeds.flatMap(({ name, expectEveryHours }) => {
    const since = lastFile.get(name) ?? store.meta(FIRST_START);
    if (expectEveryHours === null || since === null) return [];
    const hoursSilent = (now.getTime() - Date.parse(since)) / HOUR_MS;
    return hoursSilent > expectEveryHours ? [{ feed: name, hoursSilent, expectedHours: expectEveryHours }] : [];
  });
}

/** Queues one notice for each silence that began; answers how many. A silence is named by the last file before it. */
export async function reportSilences(station: Station): Promise<number> {
  const { configuration, store, clock, log } = station;
  const lastFile = store.lastFileByFeed();
  let reported = 0;
  for (const { feed, hoursSilent, expectedHours } of silentFeeds(configuration, store, clock.now())) {
    const silence = lastFile.get(feed) ?? 'never';
    const key = `silence_reported:${feed}`;
    if (store.meta(key) === silence) continue;
    const setting = mailSetting(station);
    const name = `silence.${feed}.${silence.replace(/[^0-9a-z]/g, '')}`;
    const forSoLong = timeInWords(hoursSilent);
    const notice = {
      name,
      subject: `feed ${feed} has been silent for ${forSoLong}`,
      paragraphs: [
        `The feed “${feed}” is expected to deliver every ${timeInWords(expectedHours)}. Nothing has come for ${forSoLong}${silence === 'never' ? ', and nothing ever before' : ` (last file: ${silence})`}.`,
        'Silence about glitches means nothing for pulsars of this feed until it delivers again. Check the transfer, the mount and the recorder.',
      ],
    };
    const message = newMessage(await composeOperatorNotice(notice, configuration.mail.to, setting), null, setting.now);
    store.commitNotice(message, setting.now.toISOString(), { [key]: silence });
    log.warn({ feed, hoursSilent: Math.floor(hoursSilent) }, 'feed is silent');
    reported += 1;
  }
  return reported;
}

import { composeOperatorNotice } from '../../alerts/index.ts';
import { newMessage } from '../stages/alert.ts';
import { mailSetting, type Station } from '../station.ts';

/**
 * Once a day: whether the record still keeps its own rules, and what is to be said of the tables. Both go bad without any file coming in,
 * so that nothing else would notice.
 */
export interface DailyChecks {
  /** When a day has passed since the last time; answers how many notices were queued. */
  run(): Promise<number>;
}

const DAY_MS = 86_400_000;
const CHECKED_AT = 'checked_at';
const RECORD_PROBLEMS = 'record_problems';
const PROBLEMS_NAMED = 10;

/** @param tableWarnings asked anew each day: a table runs out with time */
export function createDailyChecks(station: Station, tableWarnings: () => readonly string[]): DailyChecks {
  const { store, clock, log } = station;
  return {
    async run() {
      const now = clock.now();
      const sinceMs = now.getTime() - Date.parse(store.meta(CHECKED_AT) ?? '1970-01-01');
      // Less than nothing: the wall clock was set back.
      if (sinceMs >= 0 && sinceMs < DAY_MS) return 0;
      for (const warning of tableWarnings()) log.warn(warning);
      const problems = await store.verifyBeside();
      const before = store.meta(RECORD_PROBLEMS) ?? '[]';
      const found = JSON.stringify(problems);
      const isNews = problems.length > 0 && found !== before;
      if (isNews) await reportProblems(station, problems, { [RECORD_PROBLEMS]: found });
      else if (found !== before) store.setMeta(RECORD_PROBLEMS, found);
      store.setMeta(CHECKED_AT, now.toISOString());
      log.info({ problems: problems.length }, 'the record was checked');
      return isNews ? 1 : 0;
    },
  };
}

async function reportProblems(
  station: Station,
  problems: readonly string[],
  remember: Readonly<Record<string, string>>,
): Promise<void> {
  const setting = mailSetting(station);
  for (const problem of problems.slice(0, PROBLEMS_NAMED))
    station.log.error({ problem }, 'the record is at odds with itself');
  const more = problems.length - PROBLEMS_NAMED;
  const notice = {
    name: `record.${setting.now.getTime()}`,
    subject: 'the daily check of the record found trouble',
    paragraphs: [
      `The record in ${station.configuration.stateFolder} is at odds with itself:`,
      ...problems.slice(0, PROBLEMS_NAMED),
      ...(more > 0 ? [`and ${more} more`] : []),
      'The watch goes on. Check the disk, make a backup into another file, and compare it with an older one. The feeds still hold every arrival: a new state folder and a replay of them make the record anew.',
    ],
  };
  const composed = await composeOperatorNotice(notice, station.configuration.mail.to, setting);
  station.store.commitNotice(newMessage(composed, null, setting.now), setting.now.toISOString(), remember);
}

/** For the morning review: what the last check found, until one finds nothing. */
export function recordWarnings({ store }: Pick<Station, 'store'>): string[] {
  const problems = JSON.parse(store.meta(RECORD_PROBLEMS) ?? '[]') as string[];
  const [first] = problems;
  if (first === undefined) return [];
  const more = problems.length > 1 ? `, and ${problems.length - 1} more` : '';
  return [`the daily check of the record found trouble: ${first}${more}; check the disk and the backups`];
}

import { type MorningReview, prepareRenderer } from '../alerts/index.ts';
import { systemClock } from './clock.ts';
import { EXIT, OperatorError, reasonOf } from './errors.ts';
import { type FeedIntake, startIntake } from './feedIntake.ts';
import { watchHealth } from './health.ts';
import type { Log } from './log.ts';
import { mailerFor } from './mailerFor.ts';
import { morningReview, tableWarnings } from './morning.ts';
import { loadOrders, openRecord, problemLine } from './opening.ts';
import { createStoreDesk } from './review/storeDesk.ts';
import { openReviewPage, type ReviewPage } from './reviewPage.ts';
import { type DeliveryLoop, startDelivery } from './schedule/deliver.ts';
import { type DigestSchedule, startDigestSchedule } from './schedule/digest.ts';
import { makeDigest, reportGivenUp } from './schedule/ownMail.ts';
import { startUpkeep } from './schedule/upkeep.ts';
import { createStation, type Station } from './station.ts';
import { loadTables } from './tables/loadTables.ts';

/**
 * The daemon from its start to its end. What is needed first starts first and ends last: the record, the page, mail, then the feeds, so
 * that what a backlog turns up can be seen and told while it is worked through.
 */
export interface WatchOptions {
  readonly configFile: string;
  readonly log: Log;
  /** Aborted by a signal: finish what is in hand, then end. */
  readonly stop: AbortSignal;
  /** For the person who started it. */
  readonly say: (line: string) => void;
}

const MAIL_GRACE_MS = 5_000;

/** Resolves once stopped; rejects when it cannot start, or when the storage fails for good. */
export async function runWatch({ configFile, log, stop, say }: WatchOptions): Promise<void> {
  const { configuration, warnings: complaints } = loadOrders(configFile);
  for (const complaint of complaints) log.warn(problemLine(complaint));
  const store = openRecord(configuration, 'daemon');
  const endings: (() => Promise<void> | void)[] = [() => store.close()];
  const failure = failureOnce();
  let page: ReviewPage | null = null;
  let delivery: DeliveryLoop | null = null;
  let intake: FeedIntake | null = null;
  try {
    const clock = systemClock;
    const sky = loadTables();
    const warnings = () => tableWarnings(sky, clock.now());
    for (const warning of warnings()) log.warn(warning);
    const station = createStation({
      configuration,
      store,
      tables: sky.tables,
      clock,
      log,
      reviewUrl: () => page?.url() ?? null,
    });
    const morning = () => morningReview({ configuration, store, clock, warnings: warnings() });
    const health = () => watchHealth({ configuration, store, clock, intake, delivery });
    const desk = createStoreDesk({ configuration, store, clock, morning, health });

    page = await openReviewPage(station, desk);
    endings.push(page.close);
    const actions = { onMail: () => delivery?.wake(), onFatal: failure.raise };
    const mail = startMail(station, actions);
    delivery = mail;
    endings.push(() => mail.stop(MAIL_GRACE_MS));
    const digest = startDigest(station, morning, actions.onMail);
    endings.push(digest.stop);
    const upkeep = startUpkeep(station, { ...actions, onClockStep: digest.catchUp, tableWarnings: warnings });
    endings.push(upkeep.stop);
    intake = startIntake(station, actions);
    endings.push(intake.stop);

    say(startLine(station));
    void prepareRenderer().catch((error) => log.warn({ reason: reasonOf(error) }, 'no pictures can be drawn for mail'));
    await Promise.race([aborted(stop), failure.raised]);
    log.info('stopping');
  } finally {
    for (const end of endings.reverse()) await end();
  }
  log.info('stopped');
}

function startMail(
  station: Station,
  { onMail, onFatal }: { readonly onMail: () => void; readonly onFatal: (error: unknown) => void },
): DeliveryLoop {
  const { configuration, store, clock, log } = station;
  return startDelivery({
    store,
    clock,
    log,
    mailer: mailerFor(configuration.mail),
    from: configuration.mail.from,
    async onGivenUp(mail, state, why) {
      await reportGivenUp(station, mail, state, why);
      onMail();
    },
    onFatal,
  });
}

function startDigest(station: Station, morning: () => MorningReview, onMail: () => void): DigestSchedule {
  const { configuration, store, clock, log } = station;
  const { digestCron: cron, timezone: zone } = configuration.mail;
  const digest = startDigestSchedule({
    cron,
    zone,
    clock,
    log,
    desk: {
      wasMade: (date) => (store.lastDigest()?.civilDate ?? '') >= date,
      async make(date) {
        await makeDigest(station, date, morning());
        onMail();
      },
    },
  });
  void digest.catchUp();
  return digest;
}

function startLine({ configuration, reviewUrl }: Station): string {
  const feeds = configuration.feeds.map(({ name }) => name).join(', ');
  const url = reviewUrl();
  const page = url === null ? 'no review page yet (see the log)' : `review page: ${url}`;
  return `${configuration.observatory.name}: watching ${feeds} for ${configuration.models.size} pulsars; ${page}`;
}

function aborted(signal: AbortSignal): Promise<void> {
  if (signal.aborted) return Promise.resolve();
  return new Promise((resolve) => signal.addEventListener('abort', () => resolve(), { once: true }));
}

/** The first failure that the daemon cannot go on after. */
function failureOnce(): { readonly raised: Promise<never>; readonly raise: (error: unknown) => void } {
  let raise: (error: unknown) => void = () => {};
  const raised = new Promise<never>((_, reject) => {
    raise = (error) =>
      reject(
        new OperatorError(`the record failed: ${reasonOf(error)}`, {
          exitCode: EXIT.workFailed,
          advice: 'nothing more was written; check the disk, then start again',
          cause: error,
        }),
      );
  });
  // It may come while the daemon is still starting or ending, when nobody waits for it.
  raised.catch(() => {});
  return { raised, raise };
}

import { setTimeout as pause } from 'node:timers/promises';
import { type MorningReview, prepareRenderer } from '../alerts/index.ts';
import type { Clock } from './clock.ts';
import type { Configuration } from './config/configuration.ts';
import { reasonOf } from './errors.ts';
import { type FeedIntake, startIntake } from './feedIntake.ts';
import { pulse, watchHealth } from './health.ts';
import type { WatchOptions } from './lifecycle.ts';
import { droppedLogLines } from './log.ts';
import { mailerFor } from './mailerFor.ts';
import { watchMetrics } from './metrics/watchMetrics.ts';
import { morningReview, tableWarnings } from './morning.ts';
import { createProgress, type Progress } from './progress.ts';
import { createStoreDesk } from './review/storeDesk.ts';
import type { VerdictTokens } from './review/verdictToken.ts';
import { openReviewPage, PAGE_LIMIT_MS, type ReviewPage } from './reviewPage.ts';
import { DELIVERY_LIMIT_MS, type DeliveryLoop, startDelivery } from './schedule/deliver.ts';
import { type DigestSchedule, startDigestSchedule } from './schedule/digest.ts';
import { type HeartbeatOptions, type Heartbeats, startHeartbeats } from './schedule/heartbeat.ts';
import { mailHeartbeat, makeDigest, reportBadReload, reportGivenUp } from './schedule/ownMail.ts';
import { startUpkeep, UPKEEP_LIMIT_MS } from './schedule/upkeep.ts';
import { createStation, type Station } from './station.ts';
import type { Store } from './store/index.ts';
import { loadTables } from './tables/loadTables.ts';
import { vitalSigns } from './vitalSigns.ts';
import { startWatchdog } from './watchdog.ts';

/**
 * Everything that the daemon does under one configuration. What is needed first starts first and ends last: the page, mail, then the feeds,
 * so that what a backlog turns up can be seen and told while it is worked through.
 */
export interface ShiftParts extends Pick<WatchOptions, 'log' | 'say' | 'manager'> {
  readonly store: Store;
  readonly clock: Clock;
  /** They outlive the shift: a form that is being filled in stays good. */
  readonly tokens: VerdictTokens;
  readonly startedAt: Date;
  readonly onFatal: (error: unknown) => void;
}

export interface Shift {
  /** Tells the operators why a new configuration was not taken up. */
  readonly onBadReload: (problems: readonly string[]) => Promise<void>;
  /** Finishes what is in hand. */
  end(): Promise<void>;
}

const MAIL_GRACE_MS = 5_000;

/** Resolves when all of it has started; what had started is ended again when something cannot. */
export async function startShift(parts: ShiftParts, configuration: Configuration): Promise<Shift> {
  const { store, clock, log, manager, onFatal } = parts;
  const endings: (() => Promise<void> | void)[] = [];
  const end = async () => {
    for (const ending of endings.splice(0).reverse()) await ending();
  };
  let page: ReviewPage | null = null;
  let delivery: DeliveryLoop | null = null;
  let intake: FeedIntake | null = null;
  let heartbeats: Heartbeats | null = null;
  try {
    const sky = loadTables();
    const warnings = () => tableWarnings(sky, clock.now());
    for (const warning of warnings()) log.warn(warning);
    const progress = createProgress(clock);
    const reviewUrl = () => page?.url() ?? null;
    const station = createStation({ configuration, store, tables: sky.tables, clock, log, reviewUrl });
    const morning = () => morningReview({ configuration, store, clock, warnings: warnings() });
    const sources = () => ({ configuration, store, clock, intake, delivery, progress });
    const signs = () =>
      vitalSigns({ ...sources(), sky, startedAt: parts.startedAt, heartbeats: () => heartbeats?.signs() ?? [] });
    const health = () => watchHealth(sources());
    const metrics = () => watchMetrics({ ...sources(), vitalSigns: signs, droppedLogLines });
    const desk = createStoreDesk({ configuration, store, clock, morning, health, vitalSigns: signs, metrics });

    page = await openReviewPage(station, { desk, tokens: parts.tokens, stage: progress.stage('page', PAGE_LIMIT_MS) });
    endings.push(page.close);
    const actions = { onMail: () => delivery?.wake(), onFatal, progress };
    const mail = startMail(station, actions);
    delivery = mail;
    endings.push(() => mail.stop(MAIL_GRACE_MS));
    const digest = startDigest(station, morning, actions.onMail);
    endings.push(digest.stop);
    const stage = progress.stage('schedule', UPKEEP_LIMIT_MS);
    endings.push(
      startUpkeep(station, { ...actions, stage, onClockStep: digest.catchUp, tableWarnings: warnings }).stop,
    );
    const feeds = startIntake(station, actions);
    intake = feeds;
    endings.push(feeds.stop);

    const ready = firstLooks(feeds).then(() => void manager.tell('READY=1', 'STATUS=watching'));
    const vital = { pulse: () => pulse(sources()), log };
    endings.push(startWatchdog({ ...vital, manager, lateStages: progress.late }).stop);
    heartbeats = startHeartbeatsOf(station, { ...vital, ready, onMail: actions.onMail });
    endings.push(heartbeats.stop);

    parts.say(startLine(station));
    void prepareRenderer().catch((error) => log.warn({ reason: reasonOf(error) }, 'no pictures can be drawn for mail'));
    return {
      onBadReload: async (problems) => {
        await reportBadReload(station, problems);
        actions.onMail();
      },
      end,
    };
  } catch (error) {
    await end();
    throw error;
  }
}

const FIRST_LOOK_PATIENCE_MS = 60_000;
const ASK_EVERY_MS = 100;

/** Resolves once every feed was looked at; a feed that hangs does not keep the others from being watched. */
async function firstLooks(intake: FeedIntake): Promise<void> {
  for (let waitedMs = 0; waitedMs < FIRST_LOOK_PATIENCE_MS; waitedMs += ASK_EVERY_MS) {
    if (intake.status().every(({ lastLookMs }) => lastLookMs !== null)) return;
    await pause(ASK_EVERY_MS, undefined, { ref: false });
  }
}

interface MailActions {
  readonly onMail: () => void;
  readonly onFatal: (error: unknown) => void;
  readonly progress: Progress;
}

function startMail(station: Station, { onMail, onFatal, progress }: MailActions): DeliveryLoop {
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
    stage: progress.stage('mail', DELIVERY_LIMIT_MS),
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

function startHeartbeatsOf(
  station: Station,
  { pulse, ready, onMail, log }: Pick<HeartbeatOptions, 'pulse' | 'ready' | 'log'> & Pick<MailActions, 'onMail'>,
): Heartbeats {
  const { configuration, clock } = station;
  return startHeartbeats({
    settings: configuration.heartbeat,
    pulse,
    async mail(to) {
      const isQueued = await mailHeartbeat(station, to);
      if (isQueued) onMail();
      return isQueued;
    },
    clock,
    log,
    ready,
  });
}

function startLine({ configuration, reviewUrl }: Station): string {
  const feeds = configuration.feeds.map(({ name }) => name).join(', ');
  const url = reviewUrl();
  const page = url === null ? 'no review page yet (see the log)' : `review page: ${url}`;
  return `${configuration.observatory.name}: watching ${feeds} for ${configuration.models.size} pulsars; ${page}`;
}

import type { Clock } from './clock.ts';
import type { Configuration } from './config/configuration.ts';
import type { FeedIntake } from './feedIntake.ts';
import type { Progress } from './progress.ts';
import type { WatchHealth } from './review/desk.ts';
import type { DeliveryLoop } from './schedule/deliver.ts';
import { clocksFault } from './stages/clocks.ts';
import type { Store } from './store/index.ts';

/** What keeps the watch from being trusted, in words for a person. Silence about glitches is worth something only while this is empty. */
export interface HealthSources {
  readonly configuration: Configuration;
  readonly store: Store;
  readonly clock: Clock;
  /** Null before they have started. */
  readonly intake: Pick<FeedIntake, 'status' | 'storageTrouble'> | null;
  readonly delivery: Pick<DeliveryLoop, 'trouble'> | null;
  /** Absent: nothing of it is known. */
  readonly progress?: Pick<Progress, 'late'>;
}

/** What a heartbeat may say. */
export interface Pulse {
  /** Why the watch may not be called alive; empty: it is. */
  readonly stopped: readonly string[];
  readonly mailBlocked: boolean;
}

/** A look that is late by this many beats: the feed hangs (a dead mount, a loop that ended). */
const BEATS_LATE = 10;
const LEAST_LATE_MS = 300_000;
const MAIL_LATE_MS = 3_600_000;

export function watchHealth(sources: HealthSources): WatchHealth {
  const problems = [...feedProblems(sources), ...mailProblems(sources), ...decisionProblems(sources)];
  problems.push(...late(sources).map((stage) => `No progress: ${stage}.`));
  const storage = sources.intake?.storageTrouble() ?? null;
  if (storage !== null) problems.push(`Nothing can be written: ${storage}. Intake pauses and nothing is lost.`);
  return { ok: problems.length === 0, problems };
}

export function pulse(sources: HealthSources): Pulse {
  const storage = sources.intake?.storageTrouble() ?? null;
  const stopped = late(sources).map((stage) => `no progress: ${stage}`);
  if (storage !== null) stopped.push(`nothing can be written: ${storage}`);
  return { stopped, mailBlocked: mailWaitingMs(sources) >= MAIL_LATE_MS };
}

function late({ progress }: HealthSources): readonly string[] {
  return progress?.late() ?? [];
}

function feedProblems({ configuration, intake, clock }: HealthSources): string[] {
  const pollSeconds = new Map(configuration.feeds.map((feed) => [feed.name, feed.pollSeconds]));
  return (intake?.status() ?? []).flatMap(({ feed, lastLookMs, problems }) => {
    const limitMs = Math.max(LEAST_LATE_MS, BEATS_LATE * 1000 * (pollSeconds.get(feed) ?? 0));
    const late = lastLookMs !== null && clock.monotonicMs() - lastLookMs > limitMs;
    const told = problems
      .filter(({ kind }) => kind !== 'refused')
      .map(({ kind, path }) => `Feed ${feed}: ${kind}${path === null ? '' : ` (${path})`}.`);
    return late ? [`Feed ${feed} has not been looked at for ${Math.round(limitMs / 60_000)} minutes.`, ...told] : told;
  });
}

function mailWaitingMs({ store, clock }: HealthSources): number {
  const { oldestWaitingSince } = store.outboxCounts();
  return oldestWaitingSince === null ? 0 : clock.now().getTime() - Date.parse(oldestWaitingSince);
}

function mailProblems(sources: HealthSources): string[] {
  const waitingMs = mailWaitingMs(sources);
  if (waitingMs < MAIL_LATE_MS) return [];
  const why = sources.delivery?.trouble() ?? null;
  return [`Mail has been waiting for ${Math.floor(waitingMs / 3_600_000)} h${why === null ? '' : `: ${why}`}.`];
}

function decisionProblems({ store }: HealthSources): string[] {
  const clocks =
    clocksFault(store) === null
      ? []
      : ['The clocks of the sites could not be judged; what was known of them is kept, and the log says why.'];
  const pulsars = store
    .faultyPulsars()
    .map((pulsar) => `${pulsar} could not be decided about at its last arrival; the log says why.`);
  return [...clocks, ...pulsars];
}

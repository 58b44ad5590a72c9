import type { Clock } from './clock.ts';
import type { Configuration } from './config/configuration.ts';
import type { FeedIntake } from './feedIntake.ts';
import type { WatchHealth } from './review/desk.ts';
import type { DeliveryLoop } from './schedule/deliver.ts';
import type { Store } from './store/index.ts';

/** What keeps the watch from being trusted, in words for a person. Silence about glitches is worth something only while this is empty. */
export interface HealthSources {
  readonly configuration: Configuration;
  readonly store: Store;
  readonly clock: Clock;
  /** Null before they have started. */
  readonly intake: Pick<FeedIntake, 'status' | 'storageTrouble'> | null;
  readonly delivery: Pick<DeliveryLoop, 'trouble'> | null;
}

/** A look that is late by this many beats: the feed hangs (a dead mount, a loop that ended). */
const BEATS_LATE = 10;
const LEAST_LATE_MS = 300_000;
const MAIL_LATE_MS = 3_600_000;

export function watchHealth(sources: HealthSources): WatchHealth {
  const problems = [...feedProblems(sources), ...mailProblems(sources), ...decisionProblems(sources)];
  const storage = sources.intake?.storageTrouble() ?? null;
  if (storage !== null) problems.push(`Nothing can be written: ${storage}. Intake pauses and nothing is lost.`);
  return { ok: problems.length === 0, problems };
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

function mailProblems({ store, clock, delivery }: HealthSources): string[] {
  const { oldestWaitingSince } = store.outboxCounts();
  const waitingMs = oldestWaitingSince === null ? 0 : clock.now().getTime() - Date.parse(oldestWaitingSince);
  if (waitingMs < MAIL_LATE_MS) return [];
  const why = delivery?.trouble() ?? null;
  return [`Mail has been waiting for ${Math.floor(waitingMs / 3_600_000)} h${why === null ? '' : `: ${why}`}.`];
}

function decisionProblems({ store }: HealthSources): string[] {
  return store
    .pulsarReports()
    .filter(({ basis }) => basis.startsWith('left open'))
    .map(({ pulsar }) => `${pulsar} could not be decided about at its last arrival; the log says why.`);
}

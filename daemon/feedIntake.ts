import { type Backlog, createBacklog } from './backlog.ts';
import { systemClock } from './clock.ts';
import type { Feed } from './config/configuration.ts';
import { reasonOf } from './errors.ts';
import { Pipeline } from './pipeline.ts';
import type { Progress } from './progress.ts';
import { type FileInHand, isAsRecorded, recall } from './stages/intake.ts';
import { quarantineUnread } from './stages/unreadFile.ts';
import type { Station } from './station.ts';
import { storageTrouble } from './store/index.ts';
import type { ReadyFile, WatchProblem } from './watch/feedLook.ts';
import { helperEyes } from './watch/helperEyes.ts';
import { createWatcher, type FeedStatus, type WatcherOptions } from './watch/watcher.ts';

/** From the watched folders into the pipeline, for as long as the daemon runs. */
export interface FeedIntake {
  status(): readonly FeedStatus[];
  /** Why nothing can be written at the moment; null: it can. */
  storageTrouble(): string | null;
  /** Ends after the file in hand, or leaves it for the next start when that takes long. */
  stop(): Promise<void>;
}

export interface IntakeOptions {
  /** Mail was queued. */
  readonly onMail: () => void;
  /** The storage failed in a way that must not be retried. */
  readonly onFatal: (error: unknown) => void;
  readonly progress: Progress;
}

/** Without a step for so long a decision hangs: the longest pulsar takes a minute. */
const DECISION_LIMIT_MS = 600_000;
const LOOK_LIMIT_MS = 600_000;
/** Or for so many of the feed's own beats. */
const BEATS_LATE = 10;

export function startIntake(station: Station, { onMail, onFatal, progress }: IntakeOptions): FeedIntake {
  const { configuration, log } = station;
  const decision = progress.stage('decide', DECISION_LIMIT_MS);
  decision.rest();
  const pipeline = new Pipeline(station, decision);
  let trouble: string | null = null;

  const noteTrouble = (error: unknown) => {
    const family = storageTrouble(error);
    if (family === 'fault' || family === 'damaged') onFatal(error);
    else if (family !== null) trouble = reasonOf(error);
  };
  const guarded = async <Result>(work: () => Promise<Result>): Promise<Result> => {
    try {
      const result = await work();
      trouble = null;
      return result;
    } catch (error) {
      noteTrouble(error);
      throw error;
    }
  };

  const catchUp = decideWhatIsOpen(station, pipeline, guarded);
  const backlog: Backlog = createBacklog({
    async decide(pulsars) {
      const mails = await guarded(() => pipeline.decideOpen(pulsars));
      log.info({ pulsars: pulsars.length, mails }, 'decided about what was taken in');
      if (mails > 0) onMail();
    },
    onFailure: (error) => log.error({ reason: reasonOf(error) }, 'not decided yet; trying again in a minute'),
    clock: systemClock,
  });
  const watcher = createWatcher({
    feeds: configuration.feeds,
    openEyes: helperEyes(),
    recall: (feed, file) => recall(station, feed, file.pathBytes),
    isAsRecorded: (file, bytes) => isAsRecorded(station, file, bytes),
    clock: systemClock,
    onProblem: (problem) => noteProblem(station, problem, noteTrouble),
    onProblemEnded: (problem) => log.info({ ...factsOf(problem), was: problem.message }, 'problem ended'),
    onProgress: feedProgress(configuration.feeds, progress),
    async onSettled(file, bytes, filesWaiting) {
      const decide = filesWaiting === 0 && backlog.isEmpty ? 'now if fresh' : 'later';
      const options = { decide, mail: true, acceptUnterminated: file.stoodLong } as const;
      const result = await guarded(() => pipeline.takeIn(inHand(file, bytes), options));
      backlog.add(result.open, { isFresh: result.isFresh, filesWaiting });
      if (result.mails > 0) onMail();
      return result.kind === 'cut short' ? 'not yet whole' : 'taken';
    },
  });
  return {
    status: () => watcher.status(),
    storageTrouble: () => trouble,
    stop: async () => {
      pipeline.stop();
      const decided = backlog.stop();
      await watcher.stop();
      await decided;
      await catchUp;
    },
  };
}

function feedProgress(feeds: readonly Feed[], progress: Progress): NonNullable<WatcherOptions['onProgress']> {
  const looks = new Map(
    feeds.map(({ name, pollSeconds }) => [
      name,
      progress.stage(`feed ${name}`, Math.max(LOOK_LIMIT_MS, BEATS_LATE * pollSeconds * 1000)),
    ]),
  );
  return (feed, what) => {
    // While it waits, what it waits for must make progress.
    if (what === 'waits') looks.get(feed)?.rest();
    else looks.get(feed)?.step();
  };
}

function inHand({ feed, path, pathBytes, stamp }: ReadyFile, bytes: Buffer): FileInHand {
  return { feed, path, pathBytes, bytes, signature: stamp.signature };
}

/** On record where it keeps a file from being read, and in the log. */
function noteProblem(station: Station, problem: WatchProblem, noteTrouble: (error: unknown) => void): void {
  try {
    quarantineUnread(station, problem);
  } catch (error) {
    noteTrouble(error);
    throw error;
  }
  station.log.warn(factsOf(problem), problem.message);
}

function factsOf({ feed, kind, path }: WatchProblem): Omit<WatchProblem, 'message'> {
  return { feed, kind, path };
}

/** After a changed model, clock table or program, or a replay that was cut off. Files wait their turn behind it. */
async function decideWhatIsOpen(
  { log }: Station,
  pipeline: Pipeline,
  guarded: <Result>(work: () => Promise<Result>) => Promise<Result>,
): Promise<void> {
  const pulsars = pipeline.undecided();
  if (pulsars.length === 0) return;
  log.info({ pulsars: pulsars.length }, 'deciding again: the model, the tables, the settings or the program changed');
  try {
    // All at once: a step of a whole site must not look like one of a few pulsars in between.
    await guarded(() => pipeline.decide(pulsars, { mail: true }));
  } catch (error) {
    log.error({ reason: reasonOf(error) }, 'not decided again; the next start tries it once more');
  }
}

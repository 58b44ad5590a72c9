import { nightFile } from './feedFiles.ts';
import {
  BAD_SESSION,
  BROKEN_FILE,
  BROKEN_ROWS,
  CLOCK_STEP,
  DISPERSION_STEP,
  GLITCHES,
  type Glitch,
  LARGE_GLITCH,
  NOISY_PULSAR,
  SILENT_FEED,
  SMALL_GLITCH,
} from './happenings.ts';
import { FIRST_NIGHT_MJD, LAST_NIGHT_MJD } from './observatory.ts';
import { PULSARS } from './pulsars.ts';

/** The right answers, from what was planted alone; the program's own output has no part in them. */
export interface Expected {
  readonly nights: { readonly firstMjd: number; readonly lastMjd: number };
  /** Must be confirmed, each once. */
  readonly glitches: readonly {
    readonly pulsar: string;
    readonly epochMjd: number;
    readonly epochWithinDays: number;
    readonly deltaNuOverNu: number;
    /** As a fraction of it. */
    readonly sizeWithin: number;
    readonly confirmedAfterDays: readonly [least: number, most: number];
  }[];
  readonly dispersionSteps: readonly {
    readonly pulsar: string;
    readonly epochMjd: number;
    readonly epochWithinDays: number;
  }[];
  readonly siteEvents: readonly {
    readonly site: string;
    readonly epochMjd: number;
    readonly epochWithinDays: number;
    readonly timeStepUs: number;
    /** As a fraction of it. */
    readonly sizeWithin: number;
    readonly pulsars: readonly string[];
  }[];
  /** Arrivals of one night that must not count. */
  readonly badSessions: readonly {
    readonly pulsar: string;
    readonly nightMjd: number;
    readonly receivers: readonly string[];
  }[];
  /** Must have no confirmed event of their own. */
  readonly quiet: readonly string[];
  readonly noisy: string;
  readonly silentFeeds: readonly string[];
  /** `line` null: the whole file. The complaint must hold `reason`. */
  readonly quarantined: readonly {
    readonly feed: string;
    readonly file: string;
    readonly line: number | null;
    readonly reason: string;
  }[];
}

export function expectedAnswers(): Expected {
  const eventful: readonly string[] = [...GLITCHES, DISPERSION_STEP, BAD_SESSION].map(({ pulsar }) => pulsar);
  return {
    nights: { firstMjd: FIRST_NIGHT_MJD, lastMjd: LAST_NIGHT_MJD },
    glitches: [
      // Seen nightly: it lies between two sessions, and its size is hidden by nothing but its own recovery.
      { ...answer(LARGE_GLITCH), epochWithinDays: 1, sizeWithin: 0.03, confirmedAfterDays: [0, 5] },
      // 3 % is what 18 nights allow at best; its epoch is known only through its size.
      { ...answer(SMALL_GLITCH), epochWithinDays: 6, sizeWithin: 0.35, confirmedAfterDays: [2, 15] },
    ],
    dispersionSteps: [{ pulsar: DISPERSION_STEP.pulsar, epochMjd: DISPERSION_STEP.fromMjd, epochWithinDays: 3 }],
    siteEvents: [
      {
        site: CLOCK_STEP.site,
        epochMjd: CLOCK_STEP.fromMjdUtc,
        epochWithinDays: 3,
        timeStepUs: CLOCK_STEP.stepUs,
        sizeWithin: 0.2,
        pulsars: PULSARS.filter(({ programme }) =>
          programme.some(({ receiver }) => receiver.site === CLOCK_STEP.site),
        ).map(({ name }) => name),
      },
    ],
    badSessions: [
      {
        pulsar: BAD_SESSION.pulsar,
        nightMjd: BAD_SESSION.nightMjd,
        receivers: PULSARS.filter(({ name }) => name === BAD_SESSION.pulsar)
          .flatMap(({ programme }) => programme.map(({ receiver }) => receiver))
          .filter(({ feed }) => feed === BAD_SESSION.feed)
          .map(({ name }) => name),
      },
    ],
    quiet: PULSARS.map(({ name }) => name).filter((name) => !eventful.includes(name)),
    noisy: NOISY_PULSAR,
    silentFeeds: [SILENT_FEED.feed],
    quarantined: [
      ...BROKEN_ROWS.rows.map(({ line, reason }) => ({
        feed: BROKEN_ROWS.feed,
        file: nightFile(BROKEN_ROWS.nightMjd),
        line,
        reason,
      })),
      { feed: BROKEN_FILE.feed, file: nightFile(BROKEN_FILE.nightMjd), line: null, reason: '' },
    ],
  };
}

function answer({ pulsar, epochMjd, deltaNuOverNu }: Glitch) {
  return { pulsar, epochMjd, deltaNuOverNu };
}

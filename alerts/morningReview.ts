import type { PulsarEvent } from '../detectors/steps/pulsarEvent.ts';

/** The content of the morning: the same for the command, the digest mail and the page. Times are ISO 8601 UTC. */
export interface MorningReview {
  readonly observatory: string;
  /** The civil date it is for, in the observatory's zone. */
  readonly date: string;
  readonly since: string;
  readonly until: string;
  /** Confirmed and without a verdict, most credible first. */
  readonly waiting: readonly PulsarEvent[];
  readonly suspected: readonly PulsarEvent[];
  /** Changed state since the last review (a withdrawal, a verdict), newest first. */
  readonly changed: readonly { readonly event: PulsarEvent; readonly what: string; readonly at: string }[];
  /** News worth a mail of which none left at once: held in the quiet hours, or in a storm told by a summary alone. Newest first. */
  readonly heldBack: readonly { readonly event: PulsarEvent; readonly why: string; readonly at: string }[];
  readonly quarantined: readonly QuarantinedRow[];
  readonly silentFeeds: readonly {
    readonly feed: string;
    readonly hoursSilent: number;
    readonly expectedHours: number;
  }[];
  readonly silentPulsars: readonly {
    readonly pulsar: string;
    readonly lastArrivalMjd: number;
    readonly daysSilent: number;
  }[];
  readonly unlockedPulsars: readonly string[];
  /** What was taken in since the last review: files, arrivals, and how many pulsars they belong to. */
  readonly intake: { readonly files: number; readonly arrivals: number; readonly pulsars: number };
  /** The smallest glitch that would have been confirmed with 90 % probability, per pulsar, the blindest first; without those of which none is known. */
  readonly limits: readonly {
    readonly pulsar: string;
    readonly deltaNuOverNu90: number;
    readonly delayDays90: number;
  }[];
  readonly falseAlerts: FalseAlertCount;
  readonly mail: {
    readonly waiting: number;
    readonly oldestWaitingHours: number | null;
    /** Refused or expired since the last review. */
    readonly undelivered: readonly { readonly subject: string; readonly recipient: string; readonly why: string }[];
  };
  /** Anything the operator must know: clock tables or leap seconds that ran out, a wall clock that stepped. */
  readonly warnings: readonly string[];
}

/** The operator's budget of false alerts, and what is known of them so far. */
export interface FalseAlertCount {
  /** Of the whole programme. */
  readonly budgetPerYear: number;
  /** Ever confirmed, whatever came of it. */
  readonly confirmed: number;
  readonly accepted: number;
  readonly rejected: number;
  readonly withdrawn: number;
  /** Rejected or withdrawn, of those confirmed within a year. */
  readonly falseInLastYear: number;
  /** Steps in ν by sign: all on record, and the confirmed ones. */
  readonly suspectedSteps: { readonly up: number; readonly down: number };
  readonly confirmedSteps: { readonly up: number; readonly down: number };
}

export interface QuarantinedRow {
  readonly feed: string;
  readonly file: string;
  /** Null: the whole file. */
  readonly line: number | null;
  readonly reason: string;
  readonly at: string;
}

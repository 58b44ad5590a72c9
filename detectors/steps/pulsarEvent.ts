/** What an event is called; the words that mail, page and JSON use. */
export const EXPLANATIONS = [
  'glitch',
  'spin-down glitch',
  'slow spin-up',
  'spin-down-rate change',
  'mode switching',
  'clock step',
  'bad arrival',
  'bad session',
  'dispersion step',
  'lost count',
] as const;
export type Explanation = (typeof EXPLANATIONS)[number];

/** The detector decides the first three; a reviewer sets the last two. */
export type EventState = 'suspected' | 'confirmed' | 'withdrawn' | 'accepted' | 'rejected';

export type Interval = readonly [low: number, high: number];

export interface RecoveryTerm {
  /** Δνⱼ / Δν at the glitch. */
  readonly fraction: number;
  readonly fractionInterval68: Interval;
  readonly timescaleDays: number;
  readonly timescaleDaysInterval68: Interval;
}

/**
 * One physical event on record, as `events --json` prints it. Epochs are TDB at the barycentre; ν and ν̇ as seen there;
 * positive Δν is a spin-up. Fields that a kind of event does not have (a bad arrival has no Δν) are null.
 */
export interface PulsarEvent {
  readonly id: string;
  readonly pulsar: string;
  readonly state: EventState;
  readonly explanation: Explanation;
  /** Posterior probability by explanation; `wandering` and `quiet` may stand beside those of `EXPLANATIONS`. */
  readonly explanations: Readonly<Record<string, number>>;
  readonly epochMjd: number;
  readonly epochInterval68: Interval;
  readonly epochInterval95: Interval;
  readonly deltaNuHz: number | null;
  readonly deltaNuHzInterval68: Interval | null;
  readonly deltaNuHzInterval95: Interval | null;
  readonly deltaNuOverNu: number | null;
  readonly deltaNuOverNuInterval68: Interval | null;
  /** Hz/s */
  readonly deltaNuDot: number | null;
  readonly deltaNuDotInterval68: Interval | null;
  readonly deltaNuDotOverNuDot: number | null;
  readonly deltaNuDotOverNuDotInterval68: Interval | null;
  /** Step in arrival time (clock step, dispersion step at the reference frequency), µs; positive is late. */
  readonly timeStepUs: number | null;
  readonly timeStepUsInterval68: Interval | null;
  readonly recovery: { readonly terms: readonly RecoveryTerm[]; readonly q: number | null };
  readonly aliases: readonly { readonly deltaNuHz: number; readonly probability: number }[];
  /** Arrival times (MJD) of: the first arrival after the event; the arrivals that brought the states about. */
  readonly firstArrivalMjd: number;
  readonly suspectedAtMjd: number;
  readonly confirmedAtMjd: number | null;
  readonly arrivalsUsed: number;
  readonly logBayesFactor: number;
  readonly falseAlertsPerYearAtThisLevel: number;
  /** For a site event: the pulsars that showed it. Else just this pulsar. */
  readonly pulsars: readonly string[];
  /** The site, for a site event; before events are combined, of any clock step or bad session. */
  readonly site: string | null;
}

/** What a plot of one event shows. Deviations are in turns against the spin-down before the event; late is positive. */
export interface EventPicture {
  readonly points: readonly PicturePoint[];
  readonly fit: readonly { readonly mjd: number; readonly deviationTurns: number }[];
  /** ν from short local fits, minus the spin-down before the event. */
  readonly frequencyTrack: readonly {
    readonly mjd: number;
    readonly deltaNuHz: number;
    readonly uncertaintyHz: number;
  }[];
  readonly frequencyFit: readonly { readonly mjd: number; readonly deltaNuHz: number }[];
  readonly epochMjd: number;
  readonly epochInterval68: Interval;
  readonly frequencyHz: number;
}

export interface PicturePoint {
  readonly key: string;
  readonly mjd: number;
  readonly deviationTurns: number;
  readonly uncertaintyTurns: number;
  readonly used: boolean;
}

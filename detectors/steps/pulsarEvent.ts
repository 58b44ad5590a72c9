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

/** One exponential after a glitch. The optional fields are missing from records of older versions. */
export interface RecoveryTerm {
  /** A delayed rise is a part of the step that arrives late; its fraction is negative. */
  readonly kind?: 'recovery' | 'delayed rise';
  /** Δνⱼ / Δν at the glitch. */
  readonly fraction: number;
  readonly fractionInterval68: Interval;
  readonly fractionInterval95?: Interval;
  readonly timescaleDays: number;
  readonly timescaleDaysInterval68: Interval;
  readonly timescaleDaysInterval95?: Interval;
}

/** What a glitch stands beside. */
export interface EventContext {
  /** −ν/(2ν̇); null for a pulsar that does not spin down. */
  readonly characteristicAgeYears: number | null;
  /** Since the pulsar's last glitch; null for the first on record. */
  readonly waitedDays: number | null;
  /** Of this pulsar, oldest first: those of its model and those on record. */
  readonly earlierGlitches: readonly { readonly epochMjd: number; readonly deltaNuOverNu: number }[];
  /** ν ν̈/ν̇² between the glitch before and this one; null where it is not constrained. */
  readonly brakingIndex: { readonly value: number; readonly interval68: Interval; readonly fromMjd: number } | null;
  /** What is published of the class. */
  readonly typical: readonly { readonly text: string; readonly source: string }[];
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
  /** This and the other optional fields are missing from records of older versions. */
  readonly deltaNuOverNuInterval95?: Interval | null;
  /** Hz/s */
  readonly deltaNuDot: number | null;
  readonly deltaNuDotInterval68: Interval | null;
  readonly deltaNuDotInterval95?: Interval | null;
  readonly deltaNuDotOverNuDot: number | null;
  readonly deltaNuDotOverNuDotInterval68: Interval | null;
  readonly deltaNuDotOverNuDotInterval95?: Interval | null;
  /** Step in arrival time (clock step, dispersion step at the reference frequency), µs; positive is late. */
  readonly timeStepUs: number | null;
  readonly timeStepUsInterval68: Interval | null;
  /** Of a slow spin-up: how long ν rose, days. */
  readonly riseDays?: number | null;
  readonly riseDaysInterval68?: Interval | null;
  /** `q`: Σ Δνⱼ/Δν over what decays; null, like its intervals, while no recovery is established. */
  readonly recovery: {
    readonly terms: readonly RecoveryTerm[];
    readonly q: number | null;
    readonly qInterval68?: Interval | null;
    readonly qInterval95?: Interval | null;
  };
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
  /** For a glitch; missing from records of older versions. */
  readonly context?: EventContext;
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
  /** ν̇ from short local fits, minus the spin-down before the event, Hz/s. This and its fit are missing from records of older versions. */
  readonly spinDownTrack?: readonly {
    readonly mjd: number;
    readonly deltaNuDot: number;
    readonly uncertainty: number;
  }[];
  readonly spinDownFit?: readonly { readonly mjd: number; readonly deltaNuDot: number }[];
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

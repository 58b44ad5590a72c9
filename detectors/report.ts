import type { DetectionLimit } from './limits/detectionLimit.ts';
import type { EventPicture, PulsarEvent } from './steps/pulsarEvent.ts';

/** Strength of the random walks (turns, days) and of the measurement noise of one pulsar. */
export interface NoiseModel {
  /** Random walk in phase, turns² / day. */
  readonly phaseWalk: number;
  /** Random walk in frequency, (turns/day)² / day. */
  readonly frequencyWalk: number;
  /** Random walk in torque, (turns/day²)² / day. */
  readonly torqueWalk: number;
  /** Factor on every stated uncertainty. */
  readonly uncertaintyScale: number;
  /** Added in quadrature, turns. */
  readonly floorTurns: number;
}

/** What the detector did with one arrival. */
export interface ArrivalVerdict {
  readonly key: string;
  readonly pulseNumber: number;
  /** Against the start model with its known glitches; late is positive. */
  readonly deviationTurns: number;
  readonly uncertaintyTurns: number;
  readonly fate: 'used' | 'set aside';
  readonly reason: string;
}

/** The last arrivals of a pulsar, at most sixty, after the parabola through those in use. */
export interface RecentArrivals {
  /** Days before the last arrival (0 or less); turns, late is positive; their uncertainty. */
  readonly points: readonly (readonly [
    days: number,
    deviationTurns: number,
    uncertaintyTurns: number,
    used: boolean,
  ])[];
  /** Median time from one session to the next, days; null for a single session. */
  readonly everyDays: number | null;
}

/** Everything the detector says about one pulsar, a pure function of model, arrival log and settings. */
export interface PulsarReport {
  readonly pulsar: string;
  /** Oldest first. */
  readonly events: readonly PulsarEvent[];
  /** Event id → picture. */
  readonly pictures: ReadonlyMap<string, EventPicture>;
  readonly arrivals: readonly ArrivalVerdict[];
  readonly noise: NoiseModel;
  /** False until one pulse count has won: alerts are held until then. */
  readonly locked: boolean;
  readonly lastArrivalMjd: number | null;
  /** The smallest glitch that would have been confirmed. */
  readonly limit: DetectionLimit;
  readonly recent: RecentArrivals;
}

export interface DetectorSettings {
  /** Natural-log posterior odds that an event must reach whatever the pulsar's own null says. */
  readonly confirmLogOdds: number;
  /** The pulsar's share of the operator's budget. */
  readonly falseAlertsPerYear: number;
  readonly suspectLogOdds: number;
  /** How many recent gaps are candidates. */
  readonly windowArrivals: number;
  /** For the stated false-alert rate: pulsars in the programme. */
  readonly pulsarsInProgramme: number;
}

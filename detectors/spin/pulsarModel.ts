import type { SiteStep } from '../site/siteStep.ts';
import type { Mjd } from '../time/mjd.ts';
import type { Orbit } from './orbitModel.ts';

export type { KeplerianOrbit, Orbit, SmallEccentricityOrbit } from './orbitModel.ts';

/** A decimal number held as the unevaluated sum of two doubles: 106 bits, for phases over decades. */
export interface DoubleDouble {
  readonly hi: number;
  readonly lo: number;
}

/** The table that ships with the program, as models name it. */
export const BUILT_IN_EPHEMERIS = 'built-in';

/** A pulsar as the operator describes it: where it stands, how it spins down, what it has done before. */
export interface PulsarModel {
  readonly name: string;
  /** ICRS, at `positionEpochMjd`. */
  readonly rightAscensionRad: number;
  readonly declinationRad: number;
  readonly positionEpochMjd: number;
  /** [α cos δ, δ] */
  readonly properMotionMasPerYr: readonly [number, number];
  readonly parallaxMas: number;
  /** pc cm⁻³; where it has a slope, at that slope's epoch. */
  readonly dispersionMeasure: number;
  /** pc cm⁻³ per year; absent: constant. */
  readonly dispersionMeasureSlope?: { readonly perYr: number; readonly epochMjd: number };
  /** Electrons per cm³ of the solar wind at 1 au; absent: none. */
  readonly solarWindPerCm3?: number;
  /**
   * The Earth and Sun that position and spin were fitted with: `BUILT_IN_EPHEMERIS`, or the file of an SPK kernel; absent: what the
   * observatory uses for all.
   */
  readonly ephemeris?: string;
  readonly spin: SpinDown;
  /** Absent: an isolated pulsar. */
  readonly orbit?: Orbit;
  /** Known glitches, oldest first. */
  readonly glitches: readonly KnownGlitch[];
  /** What is known of how late receivers are; absent: all is learned. */
  readonly receivers?: readonly DeclaredOffset[];
  /** Steps of the clocks of its sites that all pulsars there have shown together; absent: none. */
  readonly siteSteps?: readonly SiteStep[];
  readonly noise: NoiseSettings;
  readonly alerts: AlertSettings;
}

/** Rotation phase polynomial, TDB. */
export interface SpinDown {
  readonly epochTdb: Mjd;
  readonly frequencyHz: DoubleDouble;
  readonly frequencyDerivativeHzPerS: number;
  readonly frequencySecondDerivativeHzPerS2: number;
  /** d³ν/dt³ in Hz/s³, d⁴ν/dt⁴ in Hz/s⁴, …; absent: none. */
  readonly higherFrequencyDerivatives?: readonly number[];
  /** Phase at the epoch; absent: 0. The detector follows the deviation from any phase, so it only shifts what is shown. */
  readonly phaseAtEpochTurns?: number;
}

/** A glitch that is part of the model: for Δt > 0 adds Δφ + Δν Δt + ½ Δν̇ Δt² + Σ Δνⱼ τⱼ (1 − e^(−Δt/τⱼ)). */
export interface KnownGlitch {
  readonly epochTdb: Mjd;
  readonly phaseTurns: number;
  readonly frequencyStepHz: number;
  readonly frequencyDerivativeStepHzPerS: number;
  readonly recoveries: readonly { readonly frequencyStepHz: number; readonly timescaleDays: number }[];
}

/**
 * How late the times of one receiver or backend are against those of a receiver of which nothing is declared. The offsets of
 * the others are learned.
 */
export interface DeclaredOffset {
  readonly receiver: string;
  /** Absent: at every site. */
  readonly site?: string;
  readonly offsetUs: number;
  readonly uncertaintyUs: number;
}

/** Values the operator fixes; what is absent is learned. */
export interface NoiseSettings {
  readonly uncertaintyScale?: number;
  readonly floorUs?: number;
}

export interface AlertSettings {
  readonly extraRecipients: readonly string[];
  /** Natural-log posterior odds that confirm an event; absent: from the budget. */
  readonly confirmLogOdds?: number;
}

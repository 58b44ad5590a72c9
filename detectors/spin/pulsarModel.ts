import type { Mjd } from '../time/mjd.ts';

/** A decimal number held as the unevaluated sum of two doubles: 106 bits, for phases over decades. */
export interface DoubleDouble {
  readonly hi: number;
  readonly lo: number;
}

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
  /** pc cm⁻³ */
  readonly dispersionMeasure: number;
  readonly spin: SpinDown;
  /** Known glitches, oldest first. */
  readonly glitches: readonly KnownGlitch[];
  readonly noise: NoiseSettings;
  readonly alerts: AlertSettings;
}

/** Rotation phase polynomial, TDB. */
export interface SpinDown {
  readonly epochTdb: Mjd;
  readonly frequencyHz: DoubleDouble;
  readonly frequencyDerivativeHzPerS: number;
  readonly frequencySecondDerivativeHzPerS2: number;
}

/** A glitch that is part of the model: for Δt > 0 adds Δφ + Δν Δt + ½ Δν̇ Δt² + Σ Δνⱼ τⱼ (1 − e^(−Δt/τⱼ)). */
export interface KnownGlitch {
  readonly epochTdb: Mjd;
  readonly phaseTurns: number;
  readonly frequencyStepHz: number;
  readonly frequencyDerivativeStepHzPerS: number;
  readonly recoveries: readonly { readonly frequencyStepHz: number; readonly timescaleDays: number }[];
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

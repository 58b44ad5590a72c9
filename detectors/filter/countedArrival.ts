/** An arrival whose whole turns have been counted: what the filter, the noise learning and the fits take in, in time order. */
export interface CountedArrival {
  /** Days from some pivot common to all arrivals of the pulsar. */
  readonly tDays: number;
  /** Unwrapped; late is positive. */
  readonly deviationTurns: number;
  /** Stated uncertainty in turns, before scale and floor. */
  readonly sigmaTurns: number;
  /** Infinity: dispersion was removed before. */
  readonly frequencyMhz: number;
  /** Site and receiver, numbered; 0 is the reference group. */
  readonly group: number;
  /** False: set aside, carries no weight. */
  readonly used: boolean;
}

/**
 * A known or suspected event: at the gap before arrival `beforeIndex` the named states are set free, so that the event
 * is a linear parameter of its own and is neither learned as noise nor found again.
 * `spin` frees phase, frequency and torque; `phase` the phase alone (clock step of a lone group, lost count);
 * `offset` the offset of `group`; `dispersion` the dispersion state.
 */
export interface Disturbance {
  readonly beforeIndex: number;
  readonly kind: 'spin' | 'phase' | 'offset' | 'dispersion';
  readonly group?: number;
}

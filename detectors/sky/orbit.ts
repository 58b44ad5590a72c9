import type { Orbit } from '../spin/orbitModel.ts';
import { addSeconds, type Mjd } from '../time/mjd.ts';
import { keplerianDelayS } from './keplerianOrbit.ts';
import { smallEccentricityDelayS } from './smallEccentricityOrbit.ts';

/**
 * The way out of a binary. A pulse emitted at t_e (TDB, as the centre of mass of the binary sees it) passes the solar-system barycentre
 * at t_e + Δ(t_e); Δ is positive when the pulsar is on the far side.
 */

/** Δ(t_e), s: what the orbit adds to a pulse emitted at `emission`. */
export function orbitDelayS(orbit: Orbit, emission: Mjd): number {
  return orbit.form === 'keplerian' ? keplerianDelayS(orbit, emission) : smallEccentricityDelayS(orbit, emission);
}

/** At a tenth of the speed of light, the most that a model may ask for, each round takes off a digit; at usual speeds three or four. */
const MOST_ROUNDS = 30;
const CLOSE_ENOUGH_S = 1e-11;

/**
 * The delay to subtract from an arrival at the barycentre, s: the d that solves d = Δ(t − d), to 0.01 ns, by fixed-point iteration, which
 * contracts by the line-of-sight speed over that of light. (A closed inverse stops at the third power of that speed, some ns in
 * wide orbits.)
 */
export function orbitDelayOfArrivalS(orbit: Orbit, barycentre: Mjd): number {
  let delayS = orbitDelayS(orbit, barycentre);
  for (let round = 0; round < MOST_ROUNDS; round++) {
    const next = orbitDelayS(orbit, addSeconds(barycentre, -delayS));
    const change = Math.abs(next - delayS);
    delayS = next;
    if (change <= CLOSE_ENOUGH_S) break;
  }
  return delayS;
}

/** When a pulse emitted at `emission` passes the solar-system barycentre. */
export function barycentreOfEmission(orbit: Orbit | undefined, emission: Mjd): Mjd {
  return orbit === undefined ? emission : addSeconds(emission, orbitDelayS(orbit, emission));
}

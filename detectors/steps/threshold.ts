/**
 * The threshold from the operator's budget of false alerts.
 *
 * Under the null a Bayes factor is a martingale of mean 1, so that P(it ever exceeds K) ≤ 1/K (Ville 1939, Étude critique
 * de la notion de collectif). Glitch hypotheses are born at rate λ a year and pulsar; so the false alerts a year of N
 * pulsars at posterior odds K are at most N λ / K, as far as the noise model holds. Real noise has more than a model
 * knows, hence the floor, found on real archives.
 */

import type { DetectorSettings } from '../report.ts';
import type { PulsarModel } from '../spin/pulsarModel.ts';
import { KINDS, RATE_PER_YEAR } from './births.ts';

const LEAST_CONFIRM_LOG_ODDS = 9;
/** Odds of 20:1 are worth a line in the morning review. */
const SUSPECT_LOG_ODDS = 3;
const WINDOW_ARRIVALS = 100;

const TOTAL_RATE = KINDS.reduce((sum, kind) => sum + RATE_PER_YEAR[kind], 0);

export function falseAlertsPerYear(logOdds: number, pulsars: number): number {
  return pulsars * TOTAL_RATE * Math.exp(-logOdds);
}

/** Settings of one pulsar: the budget shared evenly, unless its model sets a threshold of its own. */
export function detectorSettings(
  falseAlertsPerYearBudget: number,
  pulsars: number,
  model?: PulsarModel,
): DetectorSettings {
  const byBudget = Math.log((pulsars * TOTAL_RATE) / falseAlertsPerYearBudget);
  return {
    confirmLogOdds: model?.alerts.confirmLogOdds ?? Math.max(LEAST_CONFIRM_LOG_ODDS, byBudget),
    suspectLogOdds: SUSPECT_LOG_ODDS,
    windowArrivals: WINDOW_ARRIVALS,
    pulsarsInProgramme: pulsars,
  };
}

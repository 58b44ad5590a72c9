/**
 * The thresholds that hold for every pulsar; what its own noise asks for on top of them is found in `nulls/`.
 *
 * Under the null a Bayes factor is a martingale of mean 1, so that P(it ever exceeds K) ≤ 1/K (Ville 1939, Étude critique
 * de la notion de collectif). Events are expected at rate λ a year and pulsar; so the false alerts a year of one pulsar at
 * posterior odds K are at most λ / K, as far as the noise model holds. Real noise has more than a model knows, hence the
 * least odds, found on real archives and on simulated noise that is harsher than real.
 */

import type { DetectorSettings } from '../report.ts';
import type { PulsarModel } from '../spin/pulsarModel.ts';
import { KINDS, RATE_PER_YEAR } from './births.ts';

const LEAST_CONFIRM_LOG_ODDS = 6;
/** Odds of 20:1 are worth a line in the morning review. */
const SUSPECT_LOG_ODDS = 3;
const WINDOW_ARRIVALS = 100;

/** λ: events of all kinds that are expected of one pulsar in a year. */
export const TOTAL_RATE = KINDS.reduce((sum, kind) => sum + RATE_PER_YEAR[kind], 0);

/** Settings of one pulsar: the budget shared evenly, unless its model sets a threshold of its own. */
export function detectorSettings(
  falseAlertsPerYearBudget: number,
  pulsars: number,
  model?: PulsarModel,
): DetectorSettings {
  return {
    confirmLogOdds: model?.alerts.confirmLogOdds ?? LEAST_CONFIRM_LOG_ODDS,
    falseAlertsPerYear: falseAlertsPerYearBudget / pulsars,
    suspectLogOdds: SUSPECT_LOG_ODDS,
    windowArrivals: WINDOW_ARRIVALS,
    pulsarsInProgramme: pulsars,
  };
}

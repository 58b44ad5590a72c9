import type { Interval, PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import { type Cell, type CsvColumns, csvTable } from './csvTable.ts';

/** Events as a table, one event a row. */
export function eventsCsv(events: readonly PulsarEvent[]): string {
  return csvTable(events, COLUMNS);
}

const low = (interval: Interval | null): Cell => interval?.[0] ?? null;
const high = (interval: Interval | null): Cell => interval?.[1] ?? null;

const COLUMNS: CsvColumns<PulsarEvent> = [
  ['id', (e) => e.id],
  ['pulsar', (e) => e.pulsar],
  ['state', (e) => e.state],
  ['explanation', (e) => e.explanation],
  ['probability', (e) => e.explanations[e.explanation] ?? null],
  ['epoch_mjd_tdb', (e) => e.epochMjd],
  ['epoch_low_68', (e) => low(e.epochInterval68)],
  ['epoch_high_68', (e) => high(e.epochInterval68)],
  ['delta_nu_hz', (e) => e.deltaNuHz],
  ['delta_nu_low_68', (e) => low(e.deltaNuHzInterval68)],
  ['delta_nu_high_68', (e) => high(e.deltaNuHzInterval68)],
  ['delta_nu_over_nu', (e) => e.deltaNuOverNu],
  ['delta_nu_over_nu_low_68', (e) => low(e.deltaNuOverNuInterval68)],
  ['delta_nu_over_nu_high_68', (e) => high(e.deltaNuOverNuInterval68)],
  ['delta_nu_dot_hz_per_s', (e) => e.deltaNuDot],
  ['delta_nu_dot_low_68', (e) => low(e.deltaNuDotInterval68)],
  ['delta_nu_dot_high_68', (e) => high(e.deltaNuDotInterval68)],
  ['delta_nu_dot_over_nu_dot', (e) => e.deltaNuDotOverNuDot],
  ['delta_nu_dot_over_nu_dot_low_68', (e) => low(e.deltaNuDotOverNuDotInterval68)],
  ['delta_nu_dot_over_nu_dot_high_68', (e) => high(e.deltaNuDotOverNuDotInterval68)],
  ['time_step_us', (e) => e.timeStepUs],
  ['time_step_low_68', (e) => low(e.timeStepUsInterval68)],
  ['time_step_high_68', (e) => high(e.timeStepUsInterval68)],
  ['recovery_fraction', (e) => e.recovery.q],
  ['recovery_timescales_d', (e) => e.recovery.terms.map((t) => t.timescaleDays).join(' ')],
  ['first_arrival_mjd', (e) => e.firstArrivalMjd],
  ['suspected_at_mjd', (e) => e.suspectedAtMjd],
  ['confirmed_at_mjd', (e) => e.confirmedAtMjd],
  ['arrivals_used', (e) => e.arrivalsUsed],
  ['log_bayes_factor', (e) => e.logBayesFactor],
  ['false_alerts_per_year', (e) => e.falseAlertsPerYearAtThisLevel],
  ['pulsars', (e) => e.pulsars.join(' | ')],
  ['site', (e) => e.site],
];

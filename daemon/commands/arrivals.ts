import type { QuarantinedRow } from '../../alerts/index.ts';
import type { ArrivalVerdict } from '../../detectors/report.ts';
import { formatMjd } from '../../detectors/time/mjd.ts';
import { systemClock } from '../clock.ts';
import { silentLog } from '../log.ts';
import type { ArrivalRecord } from '../records.ts';
import { followPulsar } from '../stages/deviation.ts';
import { PulsarWatches } from '../stages/pulsarWatches.ts';
import { createStation } from '../station.ts';
import { loadTables } from '../tables/loadTables.ts';
import { arrivalsCsv, arrivalTable } from './arrivalForms.ts';
import { requireModel, withRecord } from './record.ts';
import { printJson, type Terminal } from './terminal.ts';

/**
 * An arrival as `arrivals --json` prints it. An infinite frequency (dispersion removed before) is null: JSON has no infinity.
 * Of a row that could not be read nothing is known but where it stands and what is wrong with it.
 */
export interface ArrivalLine {
  readonly mjd: string | null;
  readonly site: string | null;
  readonly receiver: string | null;
  readonly frequencyMhz: number | null;
  readonly uncertaintyUs: number | null;
  readonly barycentreTdbMjd: string | null;
  readonly delays: ArrivalRecord['delays'];
  readonly pulseNumber: number | null;
  readonly deviationTurns: number | null;
  readonly uncertaintyTurns: number | null;
  readonly fate: 'used' | 'set aside' | 'quarantined' | 'revised';
  readonly reason: string;
}

const NO_CHANGES = { arrivals: [], statusChanges: [], retimed: [] };

/** `arrivals`: every arrival of a pulsar on record, the rows that were refused last, and what was done with each. */
export async function arrivals(
  terminal: Terminal,
  pulsar: string,
  options: { readonly config: string; readonly json?: boolean; readonly csv?: boolean },
): Promise<void> {
  const { tables } = loadTables();
  await withRecord(options.config, (store, configuration) => {
    requireModel(pulsar, configuration);
    const parts = { configuration, store, tables, clock: systemClock, log: silentLog(), reviewUrl: () => null };
    const report = followPulsar(createStation(parts), new PulsarWatches(), pulsar, NO_CHANGES);
    const verdicts = new Map(report.arrivals.map((verdict) => [verdict.key, verdict]));
    const lines = [
      ...store.arrivals(pulsar).map((record) => arrivalLine(record, verdicts.get(record.key))),
      ...store.quarantineOf(pulsar).reverse().map(refusedLine),
    ];
    if (options.json) printJson(terminal, lines);
    else if (options.csv) terminal.out(arrivalsCsv(lines));
    else terminal.out(arrivalTable(lines));
  });
}

function arrivalLine(record: ArrivalRecord, verdict: ArrivalVerdict | undefined): ArrivalLine {
  const { timeText, site, receiver, frequencyMhz, uncertaintyUs, tdb, delays } = record;
  return {
    mjd: timeText,
    site,
    receiver,
    frequencyMhz: Number.isFinite(frequencyMhz) ? frequencyMhz : null,
    uncertaintyUs,
    barycentreTdbMjd: tdb === null ? null : formatMjd(tdb),
    delays,
    pulseNumber: verdict?.pulseNumber ?? null,
    deviationTurns: verdict?.deviationTurns ?? null,
    uncertaintyTurns: verdict?.uncertaintyTurns ?? null,
    ...fateOf(record, verdict),
  };
}

function refusedLine({ feed, file, line, reason }: QuarantinedRow): ArrivalLine {
  return {
    mjd: null,
    site: null,
    receiver: null,
    frequencyMhz: null,
    uncertaintyUs: null,
    barycentreTdbMjd: null,
    delays: null,
    pulseNumber: null,
    deviationTurns: null,
    uncertaintyTurns: null,
    fate: 'quarantined',
    reason: `${feed}/${file}, line ${line}: ${reason}`,
  };
}

function fateOf(record: ArrivalRecord, verdict: ArrivalVerdict | undefined): Pick<ArrivalLine, 'fate' | 'reason'> {
  if (record.status === 'withdrawn') return { fate: 'revised', reason: `withdrawn: ${record.reason}` };
  if (record.status === 'revised') return { fate: 'revised', reason: record.reason };
  if (verdict === undefined) return { fate: 'quarantined', reason: record.qualityReasons.join('; ') };
  const doubts = record.quality === 'ok' ? [] : record.qualityReasons;
  return { fate: verdict.fate, reason: [verdict.reason, ...doubts].filter((words) => words !== '').join('; ') };
}

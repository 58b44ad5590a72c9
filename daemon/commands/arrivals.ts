import type { ArrivalVerdict } from '../../detectors/report.ts';
import { formatMjd } from '../../detectors/time/mjd.ts';
import { systemClock } from '../clock.ts';
import { closestName } from '../closestName.ts';
import { EXIT, OperatorError } from '../errors.ts';
import { silentLog } from '../log.ts';
import type { ArrivalRecord } from '../records.ts';
import { followPulsar } from '../stages/deviation.ts';
import { PulsarWatches } from '../stages/pulsarWatches.ts';
import { createStation } from '../station.ts';
import { loadTables } from '../tables/loadTables.ts';
import { withRecord } from './record.ts';
import { table } from './table.ts';
import { printJson, type Terminal } from './terminal.ts';

/** An arrival as `arrivals --json` prints it. An infinite frequency (dispersion removed before) is null: JSON has no infinity. */
interface ArrivalLine {
  readonly mjd: string;
  readonly site: string;
  readonly receiver: string;
  readonly frequencyMhz: number | null;
  readonly uncertaintyUs: number;
  readonly barycentreTdbMjd: string | null;
  readonly delays: ArrivalRecord['delays'];
  readonly pulseNumber: number | null;
  readonly deviationTurns: number | null;
  readonly uncertaintyTurns: number | null;
  readonly fate: 'used' | 'set aside' | 'quarantined' | 'revised';
  readonly reason: string;
}

const NO_CHANGES = { arrivals: [], statusChanges: [], retimed: [] };

/** `arrivals`: every arrival of a pulsar on record, and what was done with it. */
export async function arrivals(
  terminal: Terminal,
  pulsar: string,
  options: { readonly config: string; readonly json?: boolean },
): Promise<void> {
  const { tables } = loadTables();
  await withRecord(options.config, (store, configuration) => {
    if (!configuration.models.has(pulsar)) {
      const near = closestName(pulsar, [...configuration.models.keys()]);
      throw new OperatorError(`there is no model of ${pulsar}${near === null ? '' : ` (did you mean ${near}?)`}`, {
        exitCode: EXIT.wrongUsage,
        advice: `models stand in ${configuration.modelsFolder}`,
      });
    }
    const parts = { configuration, store, tables, clock: systemClock, log: silentLog(), reviewUrl: () => null };
    const report = followPulsar(createStation(parts), new PulsarWatches(), pulsar, NO_CHANGES);
    const verdicts = new Map(report.arrivals.map((verdict) => [verdict.key, verdict]));
    const lines = store.arrivals(pulsar).map((record) => arrivalLine(record, verdicts.get(record.key)));
    if (options.json) printJson(terminal, lines);
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

function fateOf(record: ArrivalRecord, verdict: ArrivalVerdict | undefined): Pick<ArrivalLine, 'fate' | 'reason'> {
  if (record.status === 'withdrawn') return { fate: 'revised', reason: `withdrawn: ${record.reason}` };
  if (record.status === 'revised') return { fate: 'revised', reason: record.reason };
  if (verdict === undefined) return { fate: 'quarantined', reason: record.qualityReasons.join('; ') };
  const doubts = record.quality === 'ok' ? [] : record.qualityReasons;
  return { fate: verdict.fate, reason: [verdict.reason, ...doubts].filter((words) => words !== '').join('; ') };
}

function arrivalTable(lines: readonly ArrivalLine[]): string {
  const turns = (value: number | null) => (value === null ? '' : value.toFixed(5));
  return table(
    lines,
    [
      { title: 'MJD as received', text: (line) => line.mjd },
      { title: 'site', text: (line) => line.site },
      { title: 'receiver', text: (line) => line.receiver },
      { title: 'MHz', text: (line) => line.frequencyMhz?.toFixed(1) ?? 'inf', align: 'right' },
      { title: '± µs', text: (line) => line.uncertaintyUs.toPrecision(3), align: 'right' },
      { title: 'barycentre MJD (TDB)', text: (line) => line.barycentreTdbMjd?.slice(0, -3) ?? '' },
      { title: 'pulse', text: (line) => line.pulseNumber?.toString() ?? '', align: 'right' },
      { title: 'deviation, turns', text: (line) => turns(line.deviationTurns), align: 'right' },
      { title: '±', text: (line) => turns(line.uncertaintyTurns), align: 'right' },
      { title: 'fate', text: (line) => line.fate },
      { title: 'reason', text: (line) => line.reason },
    ],
    'No arrivals.',
  );
}

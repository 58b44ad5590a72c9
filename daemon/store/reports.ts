import type { PulsarTimes } from '../../detectors/site/pulsarTimes.ts';
import { type Db, row, rows, run } from './connection.ts';
import { fromJson, toJson } from './json.ts';
import type { PulsarReportRow } from './shapes.ts';

/** What the detector said last about each pulsar alone. */

interface ReportRow {
  pulsar: string;
  basis: string;
  body: string;
}

export function pulsarReport(db: Db, pulsar: string): PulsarReportRow | null {
  const found = row<ReportRow>(db, 'SELECT pulsar, basis, body FROM pulsar_reports WHERE pulsar = ?', pulsar);
  return found === undefined ? null : toReport(found);
}

export function pulsarReports(db: Db): PulsarReportRow[] {
  return rows<ReportRow>(db, 'SELECT pulsar, basis, body FROM pulsar_reports ORDER BY pulsar').map(toReport);
}

/** What the basis of a report begins with that could not be made anew. */
export const LEFT_OPEN = 'left open';

export function faultyPulsars(db: Db): string[] {
  const faulty = 'SELECT pulsar FROM pulsar_reports WHERE substr(basis, 1, length(@mark)) = @mark ORDER BY pulsar';
  return rows<{ pulsar: string }>(db, faulty, { mark: LEFT_OPEN }).map(({ pulsar }) => pulsar);
}

/** Pulsars whose turns are not counted with certainty, with how many arrivals they have. */
export function unlockedPulsars(db: Db): { readonly pulsar: string; readonly arrivals: number }[] {
  return rows<{ pulsar: string; arrivals: number }>(
    db,
    `SELECT pulsar, coalesce(body ->> '$.arrivals', 0) AS arrivals FROM pulsar_reports
     WHERE NOT body ->> '$.locked' ORDER BY pulsar`,
  );
}

function toReport({ pulsar, basis, body }: ReportRow): PulsarReportRow {
  return { pulsar, basis, ...fromJson<Omit<PulsarReportRow, 'pulsar' | 'basis'>>(body) };
}

/** What every pulsar says of the clocks of its sites: long lists, kept beside the reports and read by themselves. */
export function pulsarTimes(db: Db): PulsarTimes[] {
  const found = rows<{ times: string }>(db, 'SELECT times FROM pulsar_reports WHERE times IS NOT NULL ORDER BY pulsar');
  return found.map(({ times }) => fromJson<PulsarTimes>(times));
}

export function putPulsarReport(db: Db, report: PulsarReportRow, at: string): void {
  const { pulsar, basis, times, ...body } = report;
  run(
    db,
    `INSERT INTO pulsar_reports (pulsar, basis, body, times, at) VALUES (?, ?, ?, ?, ?)
     ON CONFLICT (pulsar) DO UPDATE SET basis = excluded.basis, body = excluded.body,
       times = coalesce(excluded.times, times), at = excluded.at`,
    pulsar,
    basis,
    toJson(`report of ${pulsar}`, body),
    times === undefined ? null : toJson(`sessions of ${pulsar}`, times),
    at,
  );
}

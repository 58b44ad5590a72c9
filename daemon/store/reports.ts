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

function toReport({ pulsar, basis, body }: ReportRow): PulsarReportRow {
  return { pulsar, basis, ...fromJson<Omit<PulsarReportRow, 'pulsar' | 'basis'>>(body) };
}

export function putPulsarReport(db: Db, report: PulsarReportRow, at: string): void {
  const { pulsar, basis, ...body } = report;
  run(
    db,
    `INSERT INTO pulsar_reports (pulsar, basis, body, at) VALUES (?, ?, ?, ?)
     ON CONFLICT (pulsar) DO UPDATE SET basis = excluded.basis, body = excluded.body, at = excluded.at`,
    pulsar,
    basis,
    toJson(`report of ${pulsar}`, body),
    at,
  );
}

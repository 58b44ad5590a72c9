import { arrivalKey } from '../../daemon/intake/key.ts';
import { type Reconciliation, reconcile } from '../../daemon/intake/reconcile.ts';
import type { ReceivedRow } from '../../daemon/intake/rows.ts';
import type { ArrivalRecord } from '../../daemon/records.ts';
import { formatMjd, normalMjd } from '../../detectors/time/mjd.ts';

/** A row at so many microseconds after MJD 60000. */
export function rowAt(microseconds: number, changes: Partial<ReceivedRow> = {}): ReceivedRow {
  const time = normalMjd(60_000, microseconds / 86_400e6);
  return {
    line: 2,
    pulsar: 'KR 0417+31',
    timeText: formatMjd(time),
    timeScale: 'UTC',
    time,
    uncertaintyUs: 10,
    frequencyMhz: 1400,
    site: 'ridge',
    receiver: 'L',
    pulseNumber: null,
    signalToNoise: null,
    note: null,
    ...changes,
  };
}

/** An arrival log in memory: the least that a store has to do for `reconcile`. */
export function createArrivalLog() {
  const records = new Map<string, ArrivalRecord>();
  /** Path → keys of the rows of the version that stands. */
  const standing = new Map<string, string[]>();
  let files = 0;
  return {
    records,
    deliver(path: string, rows: readonly ReceivedRow[]): Reconciliation {
      files += 1;
      const others = [...standing].filter(([other]) => other !== path);
      const result = reconcile({
        source: path,
        rows,
        before: (standing.get(path) ?? []).map((key) => records.get(key)!),
        onRecord: [...records.values()],
        elsewhere: new Set(others.flatMap(([, keys]) => keys)),
      });
      for (const { key, row } of result.added) records.set(key, recordOf(row, key, files));
      for (const { key, status, reason } of result.statusChanges) {
        records.set(key, { ...records.get(key)!, status, reason });
      }
      standing.set(path, [...new Set(rows.map(arrivalKey))]);
      return result;
    },
    live(): ArrivalRecord[] {
      return [...records.values()].filter(({ status }) => status === 'live').sort((a, b) => (a.key < b.key ? -1 : 1));
    },
    status(row: ReceivedRow) {
      return records.get(arrivalKey(row))?.status;
    },
  };
}

function recordOf(row: ReceivedRow, key: string, fileId: number): ArrivalRecord {
  return {
    ...row,
    key,
    fileId,
    tdb: null,
    delays: null,
    quality: 'ok',
    qualityReasons: [],
    status: 'live',
    reason: '',
    takenInAt: '2026-01-01T00:00:00.000Z',
  };
}

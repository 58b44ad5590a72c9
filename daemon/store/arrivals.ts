import type { BarycentredArrival, Quality, TimedArrival } from '../../detectors/arrival.ts';
import { daysBetween, type Mjd, SECONDS_PER_DAY } from '../../detectors/time/mjd.ts';
import type { ArrivalRecord } from '../records.ts';
import { type Db, eachOnce, prepared, row, rows, run } from './connection.ts';
import { pathBytes } from './files.ts';
import { fromJson, toJson } from './json.ts';
import type { NewArrival, RetimedArrival, Sighting, StatusChange } from './shapes.ts';

/** The arrival log: what was received, brought to the barycentre, and whether it still counts. */

interface ArrivalRow {
  key: string;
  pulsar: string;
  time_text: string;
  time_scale: 'UTC' | 'TDB';
  time_day: number;
  time_fraction: number;
  uncertainty_us: number;
  dispersion_removed: number;
  frequency_mhz: number;
  site: string;
  receiver: string;
  pulse_number: number | null;
  signal_to_noise_given: number;
  signal_to_noise: number;
  note: string | null;
  quality: Quality;
  quality_reasons: string;
  file_id: number;
  line: number;
  status: ArrivalRecord['status'];
  reason: string;
  taken_in_at: string;
  tdb_day: number | null;
  tdb_fraction: number;
  clock_s: number;
  tdb_minus_tt_s: number;
  roemer_s: number;
  shapiro_s: number;
  dispersion_s: number;
  orbit_s: number;
}

const SELECT = `SELECT a.*, f.taken_in_at, b.* FROM arrivals a JOIN files f ON f.id = a.file_id
  LEFT JOIN barycentred b ON b.arrival_id = a.id`;

/** An arrival without a TDB stands where its received time puts it. */
const IN_TIME_ORDER = 'ORDER BY coalesce(tdb_day, time_day), coalesce(tdb_fraction, time_fraction), key';

export function arrivalsOf(db: Db, pulsar: string): ArrivalRecord[] {
  return rows<ArrivalRow>(db, `${SELECT} WHERE pulsar = ? ${IN_TIME_ORDER}`, pulsar).map(toRecord);
}

export function liveArrivalsOf(db: Db, pulsar: string): ArrivalRecord[] {
  return rows<ArrivalRow>(db, `${SELECT} WHERE pulsar = ? AND status = 'live' ${IN_TIME_ORDER}`, pulsar).map(toRecord);
}

type TimedRow = [string, number, number, number, number, number, string, string, number | null];

/** Rows as arrays and only what the detector needs: several times faster than whole records. */
export function timedArrivalsOf(db: Db, pulsar: string): TimedArrival[] {
  const found = prepared(
    db,
    `SELECT key, tdb_day, tdb_fraction, uncertainty_us, dispersion_removed, frequency_mhz, site, receiver, pulse_number
     FROM arrivals a JOIN barycentred b ON b.arrival_id = a.id WHERE pulsar = ? AND status = 'live'
     ORDER BY tdb_day, tdb_fraction, key`,
  )
    .raw()
    .all(pulsar) as TimedRow[];
  return found.map(([key, day, fraction, uncertaintyUs, removed, frequency, site, receiver, pulseNumber]) => ({
    key,
    tdb: { day, fraction },
    uncertaintyUs,
    frequencyMhz: frequencyMhz(removed, frequency),
    site,
    receiver,
    pulseNumber,
  }));
}

/** How the record says infinite frequency. */
function frequencyMhz(dispersionRemoved: number, frequency: number): number {
  return dispersionRemoved === 1 ? Number.POSITIVE_INFINITY : frequency;
}

export function arrivalsNear(db: Db, pulsar: string, time: Mjd, seconds: number): ArrivalRecord[] {
  const wholeDays = Math.ceil(seconds / SECONDS_PER_DAY);
  return rows<ArrivalRow>(
    db,
    `${SELECT} WHERE pulsar = ? AND time_day BETWEEN ? AND ? ${IN_TIME_ORDER}`,
    pulsar,
    time.day - wholeDays,
    time.day + wholeDays,
  )
    .map(toRecord)
    .filter((arrival) => Math.abs(daysBetween(arrival.time, time)) * SECONDS_PER_DAY <= seconds);
}

export function arrival(db: Db, key: string): ArrivalRecord | null {
  const found = row<ArrivalRow>(db, `${SELECT} WHERE key = ?`, key);
  return found === undefined ? null : toRecord(found);
}

export function pulsars(db: Db): string[] {
  const every = `${eachOnce('pulsar', 'arrivals')} SELECT each AS pulsar FROM every WHERE each IS NOT NULL`;
  return rows<{ pulsar: string }>(db, every).map((r) => r.pulsar);
}

export function arrivalsOfFile(db: Db, feed: string, path: string | { readonly bytesHex: string }): ArrivalRecord[] {
  return rows<ArrivalRow>(
    db,
    `${SELECT} JOIN (
       SELECT arrival_id, min(s.line) AS first_line FROM sightings s JOIN files here ON here.id = s.file_id
       WHERE here.feed = ? AND here.path_bytes = ? AND here.standing = 1 GROUP BY arrival_id
     ) seen ON seen.arrival_id = a.id ORDER BY seen.first_line, key`,
    feed,
    pathBytes(path),
  ).map(toRecord);
}

export function standingElsewhere(
  db: Db,
  keys: Iterable<string>,
  feed: string,
  path: string | { readonly bytesHex: string },
): Set<string> {
  const bytes = pathBytes(path);
  const found = new Set<string>();
  for (const key of keys) {
    const other = row(
      db,
      `SELECT 1 FROM arrivals a JOIN sightings s ON s.arrival_id = a.id JOIN files f ON f.id = s.file_id
       WHERE a.key = ? AND f.standing = 1 AND NOT (f.feed = ? AND f.path_bytes = ?) LIMIT 1`,
      key,
      feed,
      bytes,
    );
    if (other !== undefined) found.add(key);
  }
  return found;
}

function toRecord(r: ArrivalRow): ArrivalRecord {
  return {
    key: r.key,
    pulsar: r.pulsar,
    timeText: r.time_text,
    timeScale: r.time_scale,
    time: { day: r.time_day, fraction: r.time_fraction },
    uncertaintyUs: r.uncertainty_us,
    frequencyMhz: frequencyMhz(r.dispersion_removed, r.frequency_mhz),
    site: r.site,
    receiver: r.receiver,
    pulseNumber: r.pulse_number,
    signalToNoise: r.signal_to_noise_given === 1 ? r.signal_to_noise : null,
    note: r.note,
    fileId: r.file_id,
    line: r.line,
    tdb: r.tdb_day === null ? null : { day: r.tdb_day, fraction: r.tdb_fraction },
    delays:
      r.tdb_day === null
        ? null
        : {
            clockS: r.clock_s,
            tdbMinusTtS: r.tdb_minus_tt_s,
            roemerS: r.roemer_s,
            shapiroS: r.shapiro_s,
            dispersionS: r.dispersion_s,
            orbitS: r.orbit_s,
          },
    quality: r.quality,
    qualityReasons: fromJson<string[]>(r.quality_reasons),
    status: r.status,
    reason: r.reason,
    takenInAt: r.taken_in_at,
  };
}

/** Adds arrivals, live, with their first sighting. */
export function insertArrivals(db: Db, fileId: number, added: readonly NewArrival[]): void {
  for (const { key, line, received: a, barycentred, quality, qualityReasons, revises } of added) {
    const { lastInsertRowid } = run(
      db,
      `INSERT INTO arrivals (key, pulsar, time_text, time_scale, time_day, time_fraction, uncertainty_us,
         dispersion_removed, frequency_mhz, site, receiver, pulse_number, signal_to_noise_given, signal_to_noise, note,
         quality, quality_reasons, file_id, line, revises, status, reason)
       VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, 'live', '')`,
      key,
      a.pulsar,
      a.timeText,
      a.timeScale,
      a.time.day,
      a.time.fraction,
      a.uncertaintyUs,
      a.frequencyMhz === Number.POSITIVE_INFINITY ? 1 : 0,
      a.frequencyMhz === Number.POSITIVE_INFINITY ? 0 : a.frequencyMhz,
      a.site,
      a.receiver,
      wholeOrNull(key, a.pulseNumber),
      a.signalToNoise === null ? 0 : 1,
      a.signalToNoise ?? 0,
      a.note,
      quality,
      toJson(`arrival ${key}`, qualityReasons),
      fileId,
      line,
      revises === null ? null : idOf(db, revises),
    );
    const id = Number(lastInsertRowid);
    putBarycentred(db, id, barycentred);
    run(db, 'INSERT INTO sightings (file_id, line, arrival_id) VALUES (?, ?, ?)', fileId, line, id);
  }
}

export function insertSightings(db: Db, fileId: number, sightings: readonly Sighting[]): void {
  for (const { key, line } of sightings) {
    run(db, 'INSERT INTO sightings (file_id, line, arrival_id) VALUES (?, ?, ?)', fileId, line, idOf(db, key));
  }
}

export function changeStatuses(db: Db, fileId: number | null, changes: readonly StatusChange[], at: string): void {
  for (const { key, status, reason } of changes) {
    const id = idOf(db, key);
    run(db, 'UPDATE arrivals SET status = ?, reason = ? WHERE id = ?', status, reason, id);
    run(
      db,
      'INSERT INTO arrival_changes (arrival_id, file_id, at, status, reason) VALUES (?, ?, ?, ?, ?)',
      id,
      fileId,
      at,
      status,
      reason,
    );
  }
}

export function retimeArrivals(db: Db, retimed: readonly RetimedArrival[]): void {
  for (const { key, barycentred, quality, qualityReasons } of retimed) {
    const id = idOf(db, key);
    const reasons = toJson(`arrival ${key}`, qualityReasons);
    run(db, 'UPDATE arrivals SET quality = ?, quality_reasons = ? WHERE id = ?', quality, reasons, id);
    run(db, 'DELETE FROM barycentred WHERE arrival_id = ?', id);
    putBarycentred(db, id, barycentred);
  }
}

function putBarycentred(db: Db, arrivalId: number, barycentred: BarycentredArrival | null): void {
  if (barycentred === null) return;
  const { tdb, delays } = barycentred;
  run(
    db,
    `INSERT INTO barycentred (arrival_id, tdb_day, tdb_fraction, clock_s, tdb_minus_tt_s, roemer_s, shapiro_s,
       dispersion_s, orbit_s) VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?)`,
    arrivalId,
    tdb.day,
    tdb.fraction,
    delays.clockS,
    delays.tdbMinusTtS,
    delays.roemerS,
    delays.shapiroS,
    delays.dispersionS,
    delays.orbitS,
  );
}

function idOf(db: Db, key: string): number {
  const found = row<{ id: number }>(db, 'SELECT id FROM arrivals WHERE key = ?', key);
  if (found === undefined) throw new Error(`There is no arrival ${key} on record.`);
  return found.id;
}

/** A pulse number that is no whole number would be stored as none at all. */
function wholeOrNull(key: string, pulseNumber: number | null): number | null {
  if (pulseNumber !== null && !Number.isSafeInteger(pulseNumber)) {
    throw new Error(`arrival ${key}: the pulse number ${pulseNumber} is not a whole number.`);
  }
  return pulseNumber;
}

import type { Mjd } from '../time/mjd.ts';
import { type ChebyshevTable, chebyshevValue, chebyshevValueAndRate, covers, endMjd } from './chebyshevTable.ts';
import type { Vector } from './vector.ts';

/**
 * Earth and Sun against the solar-system barycentre (ICRF, km), from a JPL development ephemeris, and TDB − TT at the geocentre.
 * The file is made by daemon/tables/make-tables.py, which also describes its layout.
 */
export interface EarthSunTable {
  /** For instance `DE405`. */
  readonly ephemeris: string;
  readonly startMjd: number;
  readonly endMjd: number;
  readonly earth: ChebyshevTable;
  readonly sun: ChebyshevTable;
}

export interface TdbMinusTtTable {
  /** Seconds, at the geocentre. */
  readonly geocentre: ChebyshevTable;
}

export interface EarthAndSun {
  readonly earthKm: Vector;
  readonly earthKmPerS: Vector;
  readonly sunKm: Vector;
}

/** Null: the table does not cover the date. The argument is TDB (TT will do: 2 ms move the Earth by 60 m in `earthKm`, 0.2 µs). */
export function earthAndSunAt(table: EarthSunTable, tdb: Mjd): EarthAndSun | null {
  if (!covers(table.earth, tdb) || !covers(table.sun, tdb)) return null;
  const x = chebyshevValueAndRate(table.earth, tdb, 0);
  const y = chebyshevValueAndRate(table.earth, tdb, 1);
  const z = chebyshevValueAndRate(table.earth, tdb, 2);
  return {
    earthKm: [x.value, y.value, z.value],
    earthKmPerS: [x.ratePerS, y.ratePerS, z.ratePerS],
    sunKm: [chebyshevValue(table.sun, tdb, 0), chebyshevValue(table.sun, tdb, 1), chebyshevValue(table.sun, tdb, 2)],
  };
}

/** TDB − TT at the geocentre, s; null: the table does not cover the date. TT will do for the argument. */
export function tdbMinusTtAtGeocentre(table: TdbMinusTtTable, tdb: Mjd): number | null {
  return covers(table.geocentre, tdb) ? chebyshevValue(table.geocentre, tdb, 0) : null;
}

const MAGIC = 'SKYTABLE';
const HEADER_BYTES = 32;
const ENTRY_BYTES = 32;

/**
 * Reads the tables from the bytes of the file; a problem is a sentence. Layout, little-endian:
 * `SKYTABLE`, 8 bytes of ephemeris name, uint32 number of tables, 12 bytes free; per table (earth, sun, TDB − TT) uint32 components, terms,
 * steps, 4 bytes free, float64 start (MJD, TDB), float64 step (days); then the float64 coefficients of each. Bytes that follow
 * (a checksum) are the loader's business.
 */
export function readEarthSunTable(
  bytes: Uint8Array,
): { readonly earthSun: EarthSunTable; readonly tdbMinusTt: TdbMinusTtTable } | { readonly problem: string } {
  if (bytes.byteLength < HEADER_BYTES || asciiText(bytes, 0, 8) !== MAGIC) return { problem: 'not a sky table file' };
  const view = new DataView(bytes.buffer, bytes.byteOffset, bytes.byteLength);
  const count = view.getUint32(16, true);
  if (count !== 3) return { problem: `expected 3 tables, found ${count}` };
  const tables: ChebyshevTable[] = [];
  let offset = HEADER_BYTES + ENTRY_BYTES * count;
  for (let i = 0; i < count; i++) {
    const table = readTable(view, HEADER_BYTES + ENTRY_BYTES * i, offset);
    if (table === null) return { problem: 'the file is cut short or its header is damaged' };
    tables.push(table);
    offset += table.coefficients.byteLength;
  }
  const [earth, sun, geocentre] = tables;
  if (earth === undefined || sun === undefined || geocentre === undefined) return { problem: 'a table is missing' };
  return {
    earthSun: {
      ephemeris: asciiText(bytes, 8, 16).trim(),
      startMjd: Math.max(earth.startMjd, sun.startMjd),
      endMjd: Math.min(endMjd(earth), endMjd(sun)),
      earth,
      sun,
    },
    tdbMinusTt: { geocentre },
  };
}

function readTable(view: DataView, entry: number, data: number): ChebyshevTable | null {
  if (entry + ENTRY_BYTES > view.byteLength) return null;
  const components = view.getUint32(entry, true);
  const terms = view.getUint32(entry + 4, true);
  const steps = view.getUint32(entry + 8, true);
  const startMjd = view.getFloat64(entry + 16, true);
  const stepDays = view.getFloat64(entry + 24, true);
  const length = components * terms * steps;
  if (length === 0 || !(stepDays > 0) || data + 8 * length > view.byteLength) return null;
  const coefficients = new Float64Array(length);
  for (let i = 0; i < length; i++) coefficients[i] = view.getFloat64(data + 8 * i, true);
  return { startMjd, stepDays, steps, components, terms, coefficients };
}

function asciiText(bytes: Uint8Array, from: number, to: number): string {
  return String.fromCharCode(...bytes.subarray(from, to));
}

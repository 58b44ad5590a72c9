import { statSync } from 'node:fs';
import { join } from 'node:path';
import fc from 'fast-check';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import {
  connect,
  type Db,
  requireFullSynchronisation,
  requireLibrary,
  UnsuitableLibrary,
} from '../../../daemon/store/connection.ts';
import { toJson } from '../../../daemon/store/json.ts';
import { migrate } from '../../../daemon/store/migrations.ts';
import { storageTrouble } from '../../../daemon/store/trouble.ts';
import { fileBatch, open, sampleArrival, temporaryFolder, upsert } from './sample.ts';

let folder: ReturnType<typeof temporaryFolder>;
beforeEach(() => {
  folder = temporaryFolder();
});
afterEach(() => folder.remove());

describe('the settings that the promises rest on', () => {
  // sqlite.org/pragma.html: synchronous 2 is FULL; journal_mode WAL; foreign_keys 1 is on.
  test('stay as set on a new record and on one opened again', () => {
    const file = join(folder.path, 'record.db');
    for (let opening = 0; opening < 2; opening += 1) {
      const db = connect(file, { mustExist: opening > 0 });
      if (opening === 0) migrate(db);
      db.prepare('SELECT count(*) FROM arrivals').get();
      expect(db.pragma('synchronous', { simple: true })).toBe(2);
      expect(db.pragma('journal_mode', { simple: true })).toBe('wal');
      expect(db.pragma('foreign_keys', { simple: true })).toBe(1);
      db.close();
    }
    expect(statSync(file).mode & 0o777).toBe(0o600);
  });

  test('C13: a weaker one is refused', () => {
    const db = connect(join(folder.path, 'record.db'), { mustExist: false });
    db.pragma('synchronous = NORMAL');
    expect(() => requireFullSynchronisation(db)).toThrow(UnsuitableLibrary);
    db.pragma('synchronous = FULL');
    db.pragma('foreign_keys = OFF');
    expect(() => requireFullSynchronisation(db)).toThrow(UnsuitableLibrary);
    db.close();
  });

  test.each(['3.51.2', '3.50.9', '2.99.99', '3.7.0', '3'])('C13: SQLite %s is too old', (version) => {
    expect(() => requireLibrary(version)).toThrow(UnsuitableLibrary);
  });
  test.each(['3.51.3', '3.51.10', '3.53.2', '4.0.0'])('SQLite %s will do', (version) => {
    expect(() => requireLibrary(version)).not.toThrow();
  });
});

describe('numbers that are none', () => {
  const bad = [Number.NaN, Number.POSITIVE_INFINITY, Number.NEGATIVE_INFINITY];

  test('every REAL column is NOT NULL with a range, in a STRICT table', () => {
    const db = connect(join(folder.path, 'record.db'), { mustExist: false });
    migrate(db);
    const columns = realColumns(db);
    expect(columns.length).toBeGreaterThanOrEqual(12);
    for (const { table, column, required, sql } of columns) {
      expect(required, `${table}.${column}`).toBe(1);
      expect(sql, table).toMatch(/\)\s*STRICT(, WITHOUT ROWID)?$/);
      expect(sql, `${table}.${column}`).toMatch(new RegExp(`CHECK \\([^\n]*\\b${column}\\b[^\n]*<`));
    }
    db.close();
  });

  test.each(bad)('C16: an arrival with %s anywhere leaves no trace', (value) => {
    const store = open(folder.path);
    const arrival = sampleArrival(0);
    const spoilt = [
      sampleArrival(0, { uncertaintyUs: value }),
      sampleArrival(0, { time: { day: 60_000, fraction: value } }),
      sampleArrival(0, { signalToNoise: value }),
      sampleArrival(0, { pulseNumber: value }),
      ...(value === Number.POSITIVE_INFINITY ? [] : [sampleArrival(0, { frequencyMhz: value })]),
      { ...arrival, barycentred: { ...arrival.barycentred!, tdb: { day: 60_000, fraction: value } } },
      ...(['clockS', 'tdbMinusTtS', 'roemerS', 'shapiroS', 'dispersionS', 'orbitS'] as const).map((delay) => ({
        ...arrival,
        barycentred: { ...arrival.barycentred!, delays: { ...arrival.barycentred!.delays, [delay]: value } },
      })),
    ];
    for (const one of spoilt) {
      expect(() => store.commitIntake({ ...fileBatch(0, 1), arrivals: [one] })).toThrow();
    }
    expect(() => store.commitIntake({ ...fileBatch(0, 1), events: [upsert({}, { logBayesFactor: value })] })).toThrow(
      /logBayesFactor/,
    );
    expect(store.pulsars()).toEqual([]);
    expect(store.knownFile('nightly', 'night-1.csv')).toBeNull();
    store.close();
  });

  test('C16: zero and negative uncertainties and frequencies are refused', () => {
    const store = open(folder.path);
    for (const received of [{ uncertaintyUs: 0 }, { uncertaintyUs: -1 }, { frequencyMhz: 0 }, { frequencyMhz: -1 }]) {
      expect(() => store.commitIntake({ ...fileBatch(0, 1), arrivals: [sampleArrival(0, received)] })).toThrow(/CHECK/);
    }
    store.close();
  });

  test('JSON goes there and back, or is refused', () => {
    fc.assert(
      fc.property(fc.jsonValue({ noUnicodeString: false }), fc.constantFrom(...bad), (value, notANumber) => {
        // −0 has no sign in JSON.
        expect(JSON.parse(toJson('x', value))).toEqual(JSON.parse(JSON.stringify(value)));
        expect(() => toJson('x', { deep: [value, { er: notANumber }] })).toThrow(/er/);
      }),
      { seed: 1, numRuns: 50 },
    );
  });
});

test('trouble is told by family', () => {
  const db = connect(join(folder.path, 'record.db'), { mustExist: false });
  db.exec('CREATE TABLE t (x INTEGER NOT NULL) STRICT');
  let constraint: unknown;
  try {
    db.exec('INSERT INTO t VALUES (NULL)');
  } catch (error) {
    constraint = error;
  }
  expect(storageTrouble(constraint)).toBeNull();
  expect(storageTrouble(new Error('x'))).toBeNull();

  // A full disk, by SQLite's own limit on the size of the file.
  db.pragma('max_page_count = 3');
  let full: unknown;
  try {
    db.exec('CREATE TABLE filler (x) ; INSERT INTO filler SELECT randomblob(100000)');
  } catch (error) {
    full = error;
  }
  expect(storageTrouble(full)).toBe('full');
  expect(db.prepare('SELECT count(*) AS n FROM t').get()).toEqual({ n: 0 });
  db.close();
});

interface RealColumn {
  readonly table: string;
  readonly column: string;
  readonly required: number;
  readonly sql: string;
}

function realColumns(db: Db): RealColumn[] {
  return db
    .prepare(
      `SELECT t.name AS "table", c.name AS "column", c."notnull" AS required, t.sql FROM sqlite_schema t, pragma_table_info(t.name) c
       WHERE t.type = 'table' AND c.type = 'REAL'`,
    )
    .all() as RealColumn[];
}

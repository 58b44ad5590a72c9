import { createHash } from 'node:crypto';
import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { type EarthSunTable, readEarthSunTable } from '../../detectors/sky/earthSunTable.ts';
import type { SkyTables } from '../../detectors/sky/observer.ts';
import type { LeapSecondTable } from '../../detectors/time/leapSeconds.ts';
import { packageRoot } from '../packageRoot.ts';
import { readLeapSecondFile } from './leapSecondFile.ts';

/** What is built in; `createStation` adds what the operator set. */
export interface ShippedTables extends SkyTables {
  readonly earthSun: EarthSunTable;
}

export interface LoadedTables {
  readonly tables: ShippedTables;
  /** For the log and the health page. */
  readonly warnings: readonly string[];
}

export interface LoadOptions {
  /** Where the shipped tables stand. */
  readonly folder?: string;
  /** Where the host's leap-second list may stand; the newest of all is taken. */
  readonly hostLeapSecondFiles?: readonly string[];
}

const HOST_LEAP_SECOND_FILES = ['/usr/share/zoneinfo/leap-seconds.list'];
const CHECKSUM_BYTES = 32;
const WARN_DAYS_AHEAD = 30;

/**
 * Reads the tables that ship with the program, and a newer leap-second list of the host. Throws when a shipped file is missing or
 * damaged; a host's list that cannot be used is a warning. Whether the list has expired: `leapSecondWarning`.
 */
export function loadTables(options: LoadOptions = {}): LoadedTables {
  const folder = options.folder ?? join(packageRoot(), 'daemon', 'tables');
  const { earthSun, tdbMinusTt } = loadEarthSun(join(folder, 'earth-sun.bin'));
  const warnings: string[] = [];
  const hostFiles = options.hostLeapSecondFiles ?? HOST_LEAP_SECOND_FILES;
  const leapSeconds = newestLeapSeconds(join(folder, 'leap-seconds.list'), hostFiles, warnings);
  return { tables: { earthSun, tdbMinusTt, leapSeconds, ttBipm: null, orientation: null }, warnings };
}

/** To be asked once a day: null while the list is good for another month. */
export function leapSecondWarning(table: LeapSecondTable, todayMjd: number): string | null {
  const daysLeft = Math.floor(table.expiresMjd - todayMjd);
  if (daysLeft > WARN_DAYS_AHEAD) return null;
  const state = daysLeft < 0 ? `expired ${-daysLeft} days ago` : `expires in ${daysLeft} days`;
  return `the leap-second list ${state} (MJD ${table.expiresMjd}): update the system package tzdata and restart`;
}

function loadEarthSun(file: string): Pick<ShippedTables, 'earthSun' | 'tdbMinusTt'> {
  const bytes = readFileSync(file);
  const content = bytes.subarray(0, -CHECKSUM_BYTES);
  const checksum = createHash('sha256').update(content).digest();
  if (!checksum.equals(bytes.subarray(-CHECKSUM_BYTES))) {
    throw new Error(`${file}: the checksum is wrong; install the package anew`);
  }
  const tables = readEarthSunTable(content);
  if ('problem' in tables) throw new Error(`${file}: ${tables.problem}; install the package anew`);
  return tables;
}

function newestLeapSeconds(shippedFile: string, hostFiles: readonly string[], warnings: string[]): LeapSecondTable {
  const shipped = readLeapSecondFile(shippedFile);
  if (shipped.table === null) throw new Error(`${shipped.problem}; install the package anew`);
  let newest = shipped.table;
  for (const file of hostFiles) {
    const found = readLeapSecondFile(file);
    if (found.table === null) {
      if (!found.absent) warnings.push(`${found.problem}; not used`);
    } else if (found.table.expiresMjd > newest.expiresMjd) {
      newest = found.table;
    }
  }
  return newest;
}

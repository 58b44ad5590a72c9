import type { ReceivedArrival } from '../../detectors/arrival.ts';
import { parseMjd } from '../../detectors/time/mjd.ts';
import { hasHiddenCharacters, quoted } from '../visibleText.ts';
import { isPlainDecimal, parseDecimal, parseWhole } from './numbers.ts';

/** The columns of an arrival table and what may stand in them; every layout ends here. */

export const REQUIRED_COLUMNS = ['pulsar', 'uncertainty_us', 'frequency_mhz', 'site'] as const;
export const TIME_COLUMNS = ['mjd_utc', 'mjd_tdb'] as const;
const OPTIONAL_COLUMNS = ['receiver', 'pulse_number', 'signal_to_noise', 'note'] as const;
export const ALL_COLUMNS = [...REQUIRED_COLUMNS, ...TIME_COLUMNS, ...OPTIONAL_COLUMNS] as const;
export type Column = (typeof ALL_COLUMNS)[number];

export const BARYCENTRE = 'barycentre';
export const LONGEST_NAME = 64;
const LONGEST_NOTE = 1000;
const EARLIEST_MJD = 40_000;
const LATEST_MJD = 80_000;
const LARGEST_UNCERTAINTY_US = 1e7;
const LARGEST_FREQUENCY_MHZ = 1e11;
const LARGEST_SIGNAL_TO_NOISE = 1e9;

/** Why a row cannot be used. Column null: the row as a whole. */
export interface RowProblem {
  readonly column: Column | null;
  readonly reason: string;
  /** Whose arrival it would have been, where the row says so. */
  readonly pulsar?: string;
}

/** Text of a column in this row; empty where the table has no such column. */
export type Cell = (column: Column) => string;

export function arrivalOf(cell: Cell): ReceivedArrival | RowProblem {
  try {
    const time = timeOf(cell);
    return {
      pulsar: nameIn(cell, 'pulsar'),
      ...time,
      uncertaintyUs: numberIn(cell, 'uncertainty_us', {
        fits: (value) => value > 0 && value <= LARGEST_UNCERTAINTY_US,
        wanted: `larger than 0 and at most ${LARGEST_UNCERTAINTY_US} µs`,
      }),
      frequencyMhz: frequencyOf(cell),
      site: siteOf(cell, time.timeScale),
      receiver: cell('receiver') === '' ? '' : nameIn(cell, 'receiver'),
      pulseNumber: pulseNumberOf(cell),
      signalToNoise:
        cell('signal_to_noise') === ''
          ? null
          : numberIn(cell, 'signal_to_noise', {
              fits: (value) => value >= 0 && value <= LARGEST_SIGNAL_TO_NOISE,
              wanted: `between 0 and ${LARGEST_SIGNAL_TO_NOISE}`,
            }),
      note: noteOf(cell),
    };
  } catch (error) {
    if (!(error instanceof Unusable)) throw error;
    const pulsar = cell('pulsar');
    return pulsar === '' || pulsar.length > LONGEST_NAME ? error.problem : { ...error.problem, pulsar };
  }
}

export function isProblem(result: ReceivedArrival | RowProblem): result is RowProblem {
  return 'reason' in result;
}

/**
 * Carries the first complaint about a row out of the reading of its cells, and never leaves this file. Not an Error: taking down
 * the stack for each bad row would cost ten times the reading.
 */
class Unusable {
  readonly problem: RowProblem;
  constructor(column: Column | null, reason: string) {
    this.problem = { column, reason };
  }
}

function timeOf(cell: Cell): Pick<ReceivedArrival, 'timeText' | 'timeScale' | 'time'> {
  const [utc, tdb] = [cell('mjd_utc'), cell('mjd_tdb')];
  if (utc !== '' && tdb !== '') throw new Unusable(null, 'has both mjd_utc and mjd_tdb: one of them must be empty');
  const column = tdb === '' ? 'mjd_utc' : 'mjd_tdb';
  const timeText = tdb === '' ? utc : tdb;
  if (timeText === '') throw new Unusable(column, 'is empty');
  const time = isPlainDecimal(timeText) ? parseMjd(timeText) : null;
  if (time === null) throw new Unusable(column, `${quoted(timeText)} is not a date in digits`);
  if (time.day < EARLIEST_MJD || time.day >= LATEST_MJD) {
    throw new Unusable(column, `${quoted(timeText)} is not between MJD ${EARLIEST_MJD} and ${LATEST_MJD}`);
  }
  return { timeText, timeScale: tdb === '' ? 'UTC' : 'TDB', time };
}

function siteOf(cell: Cell, timeScale: 'UTC' | 'TDB'): string {
  const site = nameIn(cell, 'site');
  if (timeScale === 'TDB' && site !== BARYCENTRE) {
    throw new Unusable('site', `${quoted(site)} with mjd_tdb: a time in TDB must be one at the site "${BARYCENTRE}"`);
  }
  if (timeScale === 'UTC' && site === BARYCENTRE) {
    throw new Unusable('site', `"${BARYCENTRE}" with mjd_utc: a time at the barycentre must be given as mjd_tdb`);
  }
  return site;
}

function frequencyOf(cell: Cell): number {
  if (cell('frequency_mhz') === 'inf') return Number.POSITIVE_INFINITY;
  return numberIn(cell, 'frequency_mhz', {
    fits: (value) => value > 0 && value <= LARGEST_FREQUENCY_MHZ,
    wanted: 'larger than 0 MHz, or inf where dispersion was removed',
  });
}

function pulseNumberOf(cell: Cell): number | null {
  const text = cell('pulse_number');
  if (text === '') return null;
  const value = parseWhole(text);
  if (value === null) throw new Unusable('pulse_number', `${quoted(text)} is not a whole number`);
  return value;
}

function noteOf(cell: Cell): string | null {
  const note = cell('note');
  if (note === '') return null;
  if (note.length > LONGEST_NOTE) throw new Unusable('note', `is longer than ${LONGEST_NOTE} characters`);
  if (/[^\P{Cc}\n\t]/u.test(note)) throw new Unusable('note', `${quoted(note)} holds control characters`);
  return note;
}

function nameIn(cell: Cell, column: Column): string {
  const text = cell(column);
  if (text === '') throw new Unusable(column, 'is empty');
  if (text.length > LONGEST_NAME) throw new Unusable(column, `is longer than ${LONGEST_NAME} characters`);
  if (hasHiddenCharacters(text)) throw new Unusable(column, `${quoted(text)} holds control or invisible characters`);
  return text;
}

function numberIn(
  cell: Cell,
  column: Column,
  rule: { readonly fits: (value: number) => boolean; readonly wanted: string },
): number {
  const text = cell(column);
  if (text === '') throw new Unusable(column, 'is empty');
  const value = parseDecimal(text);
  if (value === null) throw new Unusable(column, `${quoted(text)} is not a decimal number`);
  if (!rule.fits(value)) throw new Unusable(column, `${quoted(text)} must be ${rule.wanted}`);
  return value;
}

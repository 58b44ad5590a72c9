import { type CsvColumns, csvTable } from '../../alerts/index.ts';
import type { Delays } from '../../detectors/arrival.ts';
import type { ArrivalLine } from './arrivals.ts';
import { table } from './table.ts';

/** Arrivals with their whole bill, for the terminal and for spreadsheets. */

export function arrivalTable(lines: readonly ArrivalLine[]): string {
  const turns = (value: number | null) => value?.toFixed(5) ?? '';
  const seconds = (title: string, delay: keyof Delays, decimals: number) => ({
    title,
    text: (line: ArrivalLine) => line.delays?.[delay].toFixed(decimals) ?? '',
    align: 'right' as const,
  });
  return table(
    lines,
    [
      { title: 'MJD as received', text: (line) => line.mjd ?? '' },
      { title: 'site', text: (line) => line.site ?? '' },
      { title: 'receiver', text: (line) => line.receiver ?? '' },
      { title: 'MHz', text: (line) => frequencyText(line, (mhz) => mhz.toFixed(1)), align: 'right' },
      { title: '± µs', text: (line) => line.uncertaintyUs?.toPrecision(3) ?? '', align: 'right' },
      seconds('clock s', 'clockS', 9),
      seconds('TDB−TT s', 'tdbMinusTtS', 6),
      seconds('Roemer s', 'roemerS', 6),
      seconds('−Shapiro s', 'shapiroS', 6),
      seconds('−dispersion s', 'dispersionS', 6),
      seconds('−orbit s', 'orbitS', 6),
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

export function arrivalsCsv(lines: readonly ArrivalLine[]): string {
  return csvTable(lines, COLUMNS);
}

const COLUMNS: CsvColumns<ArrivalLine> = [
  ['mjd_as_received', (line) => line.mjd],
  ['site', (line) => line.site],
  ['receiver', (line) => line.receiver],
  ['frequency_mhz', (line) => frequencyText(line, String)],
  ['uncertainty_us', (line) => line.uncertaintyUs],
  ['clock_s', (line) => line.delays?.clockS ?? null],
  ['tdb_minus_tt_s', (line) => line.delays?.tdbMinusTtS ?? null],
  ['roemer_s', (line) => line.delays?.roemerS ?? null],
  ['shapiro_s', (line) => line.delays?.shapiroS ?? null],
  ['dispersion_s', (line) => line.delays?.dispersionS ?? null],
  ['orbit_s', (line) => line.delays?.orbitS ?? null],
  ['barycentre_mjd_tdb', (line) => line.barycentreTdbMjd],
  ['pulse_number', (line) => line.pulseNumber],
  ['deviation_turns', (line) => line.deviationTurns],
  ['uncertainty_turns', (line) => line.uncertaintyTurns],
  ['fate', (line) => line.fate],
  ['reason', (line) => line.reason],
];

/** `inf` as the feeds write it; empty for a row of which nothing is known. */
function frequencyText({ mjd, frequencyMhz }: ArrivalLine, text: (mhz: number) => string): string {
  if (frequencyMhz !== null) return text(frequencyMhz);
  return mjd === null ? '' : 'inf';
}

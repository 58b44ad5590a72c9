import { compareMjd } from '../../detectors/time/mjd.ts';
import { BROKEN_FILE, BROKEN_ROWS, SILENT_FEED } from './happenings.ts';
import { FEEDS, type FeedName, FIRST_NIGHT_MJD, LAST_NIGHT_MJD } from './observatory.ts';
import { mjdText, type RecordedArrival } from './observing.ts';

/** A file to be written: its path below sample-feeds/ and its content. */
export interface MadeFile {
  readonly path: string;
  readonly content: string;
}

const HEADER = 'pulsar,mjd_utc,uncertainty_us,frequency_mhz,site,receiver';

/** One file a feed and night, rows in time order, faults included. */
export function feedFiles(recorded: readonly RecordedArrival[]): MadeFile[] {
  const files: MadeFile[] = [];
  for (const feed of FEEDS) {
    for (let night = FIRST_NIGHT_MJD; night <= LAST_NIGHT_MJD; night++) {
      if (feed === SILENT_FEED.feed && night > SILENT_FEED.lastNightMjd) continue;
      const rows = recorded
        .filter(({ receiver, reading }) => receiver.feed === feed && reading.day === night)
        .sort((a, b) => compareMjd(a.reading, b.reading))
        .map(row);
      if (rows.length > 0) files.push({ path: nightPath(feed, night), content: nightText(feed, night, rows) });
    }
  }
  return files;
}

/** `main/2025-11-14.csv` */
export function nightPath(feed: FeedName, mjd: number): string {
  return `${feed}/${nightFile(mjd)}`;
}

export function nightFile(mjd: number): string {
  return `${civilDate(mjd)}.csv`;
}

const UNIX_EPOCH_MJD = 40_587;

export function civilDate(mjd: number): string {
  return new Date((mjd - UNIX_EPOCH_MJD) * 86_400_000).toISOString().slice(0, 10);
}

function row({ pulsar, reading, uncertaintyUs, receiver }: RecordedArrival): string {
  const { frequencyMhz, site, name } = receiver;
  return `${pulsar},${mjdText(reading)},${uncertaintyUs.toFixed(2)},${frequencyMhz.toFixed(3)},${site},${name}`;
}

function nightText(feed: FeedName, night: number, rows: readonly string[]): string {
  if (feed === BROKEN_FILE.feed && night === BROKEN_FILE.nightMjd) return '\0'.repeat(BROKEN_FILE.bytes);
  const lines = [HEADER, ...rows];
  if (feed === BROKEN_ROWS.feed && night === BROKEN_ROWS.nightMjd) {
    for (const { line, text } of BROKEN_ROWS.rows) {
      if (line > lines.length + 1)
        throw new Error(`the file of MJD ${night} is too short for a broken row at line ${line}`);
      lines.splice(line - 1, 0, text);
    }
  }
  return `${lines.join('\n')}\n`;
}

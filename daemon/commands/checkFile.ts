import { readFile, realpath, stat } from 'node:fs/promises';
import type { ReceivedArrival } from '../../detectors/arrival.ts';
import { EXIT, OperatorError, reasonOf } from '../errors.ts';
import { feedFolders, placeIn } from '../feedFolders.ts';
import type { ArrivalFile, ReceivedRow } from '../intake/rows.ts';
import { loadOrders } from '../opening.ts';
import { missingFor, readInHand } from '../stages/intake.ts';
import { loadTables } from '../tables/loadTables.ts';
import { visibleText } from '../visibleText.ts';
import { LARGEST_FILE_BYTES } from '../watch/open.ts';
import { table } from './table.ts';
import { printJson, type Terminal } from './terminal.ts';

/** `check --file`: how a feed reads a file, quantity by quantity, and every complaint. Nothing is taken in. */
export async function checkFile(
  terminal: Terminal,
  options: { readonly config: string; readonly file: string; readonly feed?: string; readonly json?: boolean },
): Promise<void> {
  const { configuration } = loadOrders(options.config);
  const wanted = options.feed ?? null;
  const folders = await feedFolders(configuration, wanted);
  const { file, bytes } = await readWhole(options.file);
  const { feed, pathInFeed } = placeIn(folders, file, wanted);
  const { layout } = folders.find((folder) => folder.feed.name === feed)!.feed;
  const read = readInHand({ configuration, tables: loadTables().tables }, { feed, path: pathInFeed, bytes });
  const sites = new Map(configuration.sites.map((site) => [site.name, { itrfM: site.itrfM, clock: site.clockTable }]));
  const complaints = complaintsAbout(read, (row) => missingFor({ configuration, sites }, row));
  const usable = read.rows.length + read.rejects.length - complaints.length;
  const facts = { file: options.file, feed, layout, fault: read.fault, unterminated: read.unterminated };
  if (options.json) {
    const { ignoredColumns, warnings } = read;
    printJson(terminal, {
      ...facts,
      ignoredColumns,
      warnings,
      usable,
      complaints,
      rows: read.rows.slice(0, FIRST_ROWS).map(shown),
    });
  } else {
    terminal.out(`${visibleText(options.file)}, as feed ${visibleText(feed)} reads it (layout ${layout})`);
    for (const line of notesAbout(read)) terminal.out(line);
    if (read.rows.length > 0) terminal.out(`\n${firstRows(read.rows)}\n`);
    for (const { line, text } of complaints) terminal.out(`line ${line}: ${visibleText(text)}`);
    if (read.fault === null) terminal.out(`${usable} rows can be used, ${complaints.length} cannot.`);
  }
  if (read.fault !== null) throw failed(`${options.file} ${read.fault}`);
  if (complaints.length > 0) throw failed(`${complaints.length} rows of ${options.file} cannot be used`);
}

/** As many as stand beside each other on a screen. */
const FIRST_ROWS = 3;

function failed(words: string): OperatorError {
  return new OperatorError(visibleText(words), { exitCode: EXIT.workFailed });
}

async function readWhole(given: string): Promise<{ readonly file: string; readonly bytes: Buffer }> {
  try {
    const file = await realpath(given);
    const { size } = await stat(file);
    if (size > LARGEST_FILE_BYTES) throw failed(`${given} is ${size} bytes long; the limit is ${LARGEST_FILE_BYTES}`);
    return { file, bytes: await readFile(file) };
  } catch (error) {
    if (error instanceof OperatorError) throw error;
    throw failed(`${given} cannot be read: ${reasonOf(error)}`);
  }
}

interface Complaint {
  readonly line: number;
  readonly column: string | null;
  readonly reason: string;
  readonly text: string;
}

function complaintsAbout(read: ArrivalFile, missing: (row: ReceivedRow) => string | null): Complaint[] {
  const rejected = read.rejects.map(({ line, column, reason }) => ({
    line,
    column,
    reason,
    text: column === null ? reason : `${column} ${reason}`,
  }));
  const homeless = read.rows.flatMap((row) => {
    const reason = missing(row);
    return reason === null ? [] : [{ line: row.line, column: null, reason, text: reason }];
  });
  return [...rejected, ...homeless].sort((a, b) => a.line - b.line);
}

function notesAbout({ warnings, ignoredColumns, unterminated }: ArrivalFile): string[] {
  const notes = warnings.map((warning) => `warning: ${warning}`);
  if (ignoredColumns.length > 0) notes.push(`not ours, and not kept: ${ignoredColumns.join(', ')}`);
  if (unterminated) notes.push('warning: the file may still be growing: its end is missing');
  return notes;
}

const QUANTITIES: readonly (readonly [string, (row: ReceivedArrival) => string | number | null])[] = [
  ['pulsar', (row) => row.pulsar],
  ['time', (row) => `${row.timeText} ${row.timeScale} (MJD)`],
  ['uncertainty', (row) => `${row.uncertaintyUs} µs`],
  ['frequency', (row) => (Number.isFinite(row.frequencyMhz) ? `${row.frequencyMhz} MHz` : 'dispersion removed')],
  ['site', (row) => row.site],
  ['receiver', (row) => row.receiver],
  ['pulse number', (row) => row.pulseNumber],
  ['signal to noise', (row) => row.signalToNoise],
  ['note', (row) => row.note],
];

function firstRows(rows: readonly ReceivedRow[]): string {
  const first = rows.slice(0, FIRST_ROWS);
  return table(
    QUANTITIES,
    [
      { title: 'quantity', text: ([name]) => name },
      ...first.map((row) => ({
        title: `line ${row.line}`,
        text: ([, of]: (typeof QUANTITIES)[number]) => `${of(row) ?? ''}`,
      })),
    ],
    '',
  );
}

/** JSON has no infinity. */
function shown(row: ReceivedRow) {
  return { ...row, frequencyMhz: Number.isFinite(row.frequencyMhz) ? row.frequencyMhz : 'inf' };
}

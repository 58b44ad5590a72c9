import { createHash } from 'node:crypto';
import { closestName } from '../closestName.ts';
import { BARYCENTRE } from '../intake/arrivalFields.ts';
import { arrivalKey } from '../intake/key.ts';
import { readArrivalFile } from '../intake/layouts/read.ts';
import { type Reconciliation, reconcile } from '../intake/reconcile.ts';
import type { ArrivalFile, ReceivedRow } from '../intake/rows.ts';
import type { Station } from '../station.ts';
import type { NewFile, QuarantinedLine } from '../store/index.ts';
import { quoted } from '../visibleText.ts';
import type { TakenFile } from '../watch/feedMemory.ts';
import { layoutMark, withoutLayoutMark } from './layoutMark.ts';
import { earlier, heldReason, marksOf, readMarks, type Waiting } from './waitingRows.ts';

/** A file that stood still, as the watcher or `replay` hands it over. */
export interface FileInHand {
  readonly feed: string;
  /** Relative to the feed's folder, in its one writing. */
  readonly path: string;
  /** The name's bytes; the identity of the path. */
  readonly pathBytes: Buffer;
  readonly bytes: Buffer;
  /** What `stat` said. */
  readonly signature: string;
}

/** What a file says, sorted into what is new, what is known and what cannot be used. */
export interface Intake {
  readonly file: NewFile;
  readonly reconciliation: Reconciliation;
  readonly quarantined: readonly QuarantinedLine[];
  readonly unterminated: boolean;
}

export function takeRows(station: Station, inHand: FileInHand): Intake {
  const read = readInHand(station, inHand);
  if (read.ignoredColumns.length > 0) {
    station.log.warn(
      { feed: inHand.feed, file: inHand.path, columns: read.ignoredColumns },
      'columns that are not ours',
    );
  }
  for (const warning of read.warnings) {
    station.log.warn({ feed: inHand.feed, file: inHand.path, warning }, 'read with a doubt');
  }
  const known: ReceivedRow[] = [];
  const quarantined: QuarantinedLine[] = read.rejects.map(({ line, column, reason, pulsar = null }) => ({
    line,
    pulsar,
    reason: column === null ? reason : `${column} ${reason}`,
  }));
  let waiting: Waiting = { forNames: false, forMjd: null };
  for (const row of read.rows) {
    const missing = missingFor(station, row);
    const reason = missing ?? heldReason(station, row);
    // What is on record stays there, also when its model was taken away since.
    if (reason === null || station.store.arrival(arrivalKey(row)) !== null) known.push(row);
    else {
      quarantined.push({ line: row.line, pulsar: row.pulsar, reason });
      waiting =
        missing === null ? { ...waiting, forMjd: earlier(waiting.forMjd, row) } : { ...waiting, forNames: true };
    }
  }
  if (read.fault !== null) quarantined.push({ line: null, reason: read.fault });
  return {
    file: describeFile(station, inHand, { read, waiting }),
    reconciliation: reconcileWithRecord(station, inHand, read.fault === null ? known : null),
    quarantined: quarantined.sort((a, b) => (a.line ?? 0) - (b.line ?? 0)),
    unterminated: read.unterminated,
  };
}

/** The file as its feed's layout reads it. */
export function readInHand({ configuration, tables }: ReadingStation, { feed, path, bytes }: FileToRead): ArrivalFile {
  const layout = configuration.feeds.find(({ name }) => name === feed) ?? { layout: 'csv', columns: null };
  return readArrivalFile(bytes, layout, { path, leapSeconds: tables.leapSeconds });
}

type ReadingStation = Pick<Station, 'configuration' | 'tables'>;
type FileToRead = Pick<FileInHand, 'feed' | 'path' | 'bytes'>;

/** What the configuration lacks for a row; null: nothing. */
export function missingFor(
  { configuration, sites }: Pick<Station, 'configuration' | 'sites'>,
  row: ReceivedRow,
): string | null {
  if (!configuration.models.has(row.pulsar)) {
    const near = closestName(row.pulsar, [...configuration.models.keys()]);
    const guess = near === null ? '' : ` (did you mean ${quoted(near)}?)`;
    return `pulsar ${quoted(row.pulsar)} has no model${guess}: add one with that name to ${configuration.modelsFolder} and start again`;
  }
  if (row.site === BARYCENTRE || sites.has(row.site)) return null;
  const near = closestName(row.site, [...sites.keys()]);
  const guess = near === null ? '' : ` (did you mean ${quoted(near)}?)`;
  return `site ${quoted(row.site)} is not known${guess}: add a [[site]] with that name to ${configuration.file} and start again`;
}

function describeFile(
  station: Station,
  inHand: FileInHand,
  { read, waiting }: { readonly read: ArrivalFile; readonly waiting: Waiting },
): NewFile {
  const identity = identityOf(station, inHand);
  return {
    ...identity,
    signature: identity.signature + marksOf(station, waiting),
    rows: read.rows.length + read.rejects.length,
    fault: read.fault,
  };
}

/** What is known of a file before anything is made of its bytes. */
export type FileIdentity = Omit<NewFile, 'rows' | 'fault'>;

export function identityOf(station: Station, { feed, path, pathBytes, bytes, signature }: FileInHand): FileIdentity {
  return {
    feed,
    path,
    pathBytesHex: pathBytes.toString('hex'),
    sha256: sha256Of(bytes),
    bytes: bytes.length,
    signature: signature + layoutMark(station, feed),
  };
}

/** The fault of a file that was set aside unread begins with this. */
export const SET_ASIDE = 'set aside';

/** What the watcher needs to know of a path: the content that was taken in last, unless what its rows waited for is there now. */
export function recall(station: Station, feed: string, pathBytes: Buffer): TakenFile | null {
  const known = station.store.knownFile(feed, { bytesHex: pathBytes.toString('hex') });
  if (known === null) return null;
  const { plain: marked, isOver, isHeld } = readMarks(station, known.signature);
  const { plain, mark } = withoutLayoutMark(marked);
  const isCurrent = !isOver && mark === layoutMark(station, feed);
  return { signature: isCurrent ? plain : '', bytes: known.bytes, isHeld };
}

/** Whether a file stands on record as it is now; one that was only touched is noted as such. */
export function isOnRecord(station: Station, inHand: FileInHand): boolean {
  const { store } = station;
  const before = recall(station, inHand.feed, inHand.pathBytes);
  if (before === null || before.signature === '') return false;
  if (before.signature === inHand.signature) return true;
  const known = store.knownFile(inHand.feed, { bytesHex: inHand.pathBytes.toString('hex') });
  if (known?.sha256 !== sha256Of(inHand.bytes) || known.fault?.startsWith(SET_ASIDE)) return false;
  const { marks } = readMarks(station, known.signature);
  store.noteUnchanged(known.id, inHand.signature + layoutMark(station, inHand.feed) + marks);
  return true;
}

/** No file has it: the path is read as one that changed. */
const SILENTLY_EDITED = 'silently edited';

/** Whether the bytes of a path are those on record, where a file that looks the same is read through again; if not, the record forgets its look. */
export function isAsRecorded(
  { store, log }: Station,
  { feed, path, pathBytes }: Pick<FileInHand, 'feed' | 'path' | 'pathBytes'>,
  bytes: Buffer,
): boolean {
  const known = store.knownFile(feed, { bytesHex: pathBytes.toString('hex') });
  if (known === null || known.sha256 === '' || known.sha256 === sha256Of(bytes)) return true;
  log.warn({ feed, file: path }, 'silent edit: other bytes under the same length and times; the file is read again');
  store.noteUnchanged(known.id, SILENTLY_EDITED);
  return false;
}

function sha256Of(bytes: Buffer): string {
  return createHash('sha256').update(bytes).digest('hex');
}

/** Rows within this of each other may be values of one arrival; a little more than the 1 µs of the rule does no harm. */
const NEAR_S = 2e-6;
const NOTHING: Reconciliation = { added: [], same: [], statusChanges: [], pulsarsToDecide: [] };

/** @param rows null: the file could not be read; what it said before goes on standing */
function reconcileWithRecord(
  { store }: Station,
  inHand: FileInHand,
  rows: readonly ReceivedRow[] | null,
): Reconciliation {
  if (rows === null) return NOTHING;
  const path = { bytesHex: inHand.pathBytes.toString('hex') };
  const before = store.arrivalsOfFile(inHand.feed, path);
  const near = new Map(
    [...rows, ...before].flatMap((row) => store.arrivalsNear(row.pulsar, row.time, NEAR_S)).map((r) => [r.key, r]),
  );
  const keys = new Set([...near.keys(), ...before.map((record) => record.key)]);
  return reconcile({
    source: `${inHand.feed}/${inHand.path}`,
    rows,
    before,
    onRecord: [...near.values()],
    elsewhere: store.standingElsewhere(keys, inHand.feed, path),
  });
}

import { createHash } from 'node:crypto';
import { closestName } from '../config/closestName.ts';
import { BARYCENTRE } from '../intake/arrivalFields.ts';
import { type Reconciliation, reconcile } from '../intake/reconcile.ts';
import { type ArrivalFile, type ReceivedRow, readArrivalFile } from '../intake/rows.ts';
import type { Station } from '../station.ts';
import type { NewFile, QuarantinedLine } from '../store/index.ts';
import { quoted } from '../visibleText.ts';

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
  const read = readArrivalFile(inHand.bytes);
  if (read.ignoredColumns.length > 0) {
    station.log.warn(
      { feed: inHand.feed, file: inHand.path, columns: read.ignoredColumns },
      'columns that are not ours',
    );
  }
  const known: ReceivedRow[] = [];
  const quarantined: QuarantinedLine[] = read.rejects.map(({ line, column, reason }) => ({
    line,
    reason: column === null ? reason : `${column} ${reason}`,
  }));
  const held = new Set<string>();
  for (const row of read.rows) {
    const missing = missingFor(station, row);
    if (missing === null) known.push(row);
    else {
      quarantined.push({ line: row.line, reason: missing.reason });
      held.add(missing.name);
    }
  }
  if (read.fault !== null) quarantined.push({ line: null, reason: read.fault });
  return {
    file: describeFile(station, inHand, { read, held }),
    reconciliation: reconcileWithRecord(station, inHand, read.fault === null ? known : null),
    quarantined: quarantined.sort((a, b) => (a.line ?? 0) - (b.line ?? 0)),
    unterminated: read.unterminated,
  };
}

/** What the configuration lacks for a row; null: nothing. */
function missingFor({ configuration, sites }: Station, row: ReceivedRow): { name: string; reason: string } | null {
  if (!configuration.models.has(row.pulsar)) {
    const near = closestName(row.pulsar, [...configuration.models.keys()]);
    const guess = near === null ? '' : ` (did you mean ${quoted(near)}?)`;
    const reason = `pulsar ${quoted(row.pulsar)} has no model${guess}: add a file with that name to ${configuration.modelsFolder} and start again`;
    return { name: row.pulsar, reason };
  }
  if (row.site === BARYCENTRE || sites.has(row.site)) return null;
  const near = closestName(row.site, [...sites.keys()]);
  const guess = near === null ? '' : ` (did you mean ${quoted(near)}?)`;
  const reason = `site ${quoted(row.site)} is not known${guess}: add a [[site]] with that name to ${configuration.file} and start again`;
  return { name: row.site, reason };
}

function describeFile(
  station: Station,
  inHand: FileInHand,
  { read, held }: { readonly read: ArrivalFile; readonly held: ReadonlySet<string> },
): NewFile {
  return {
    feed: inHand.feed,
    path: inHand.path,
    pathBytesHex: inHand.pathBytes.toString('hex'),
    sha256: createHash('sha256').update(inHand.bytes).digest('hex'),
    bytes: inHand.bytes.length,
    signature: held.size === 0 ? inHand.signature : heldSignature(station, inHand.signature),
    rows: read.rows.length + read.rejects.length,
    fault: read.fault,
  };
}

/**
 * The signature under which a file goes on record whose rows wait for a model or a site: with the names that were known, so that the file
 * is read again, by itself, once the configuration knows others.
 */
export function heldSignature({ configuration, sites }: Station, signature: string): string {
  const names = JSON.stringify([[...configuration.models.keys()].sort(), [...sites.keys()].sort()]);
  return `${signature} held ${createHash('sha256').update(names).digest('hex').slice(0, 16)}`;
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

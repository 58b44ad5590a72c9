import { compareMjd } from '../../detectors/time/mjd.ts';
import type { ArrivalRecord } from '../records.ts';
import { arrivalKey, isSameTime, measurementOf } from './key.ts';
import type { ReceivedRow } from './rows.ts';

/**
 * What a file, delivered for the first time or again, changes on the arrival log. Nothing is erased: a value that lost is
 * `revised`, a row that no file states any more is `withdrawn`.
 *
 * Of several values of one arrival (see key.ts) exactly one is live. What a file says for the first time wins over what was said
 * before, within a file the later line; a file that only repeats an older value overrules nothing. When the winner goes, the
 * value taken in last among those still standing counts again. So the live set is the same for any order of files as long as
 * they do not contradict each other; where they do, the one delivered last is believed.
 */
export interface Delivery {
  /** For reasons: the file as people know it. */
  readonly source: string;
  /** Every readable row of the file now. */
  readonly rows: readonly ReceivedRow[];
  /** What the version that the file replaces contained; empty for a new path. */
  readonly before: readonly ArrivalRecord[];
  /** Arrivals on record, of any status: at least all within 1 µs of a row of `rows` or `before`; more do no harm. */
  readonly onRecord: readonly ArrivalRecord[];
  /** Keys, of `before` and `onRecord`, that some other file states too as it stands now. */
  readonly elsewhere: ReadonlySet<string>;
}

export interface Reconciliation {
  /** Rows with new content, one each, live unless `statusChanges` says otherwise. */
  readonly added: readonly AddedArrival[];
  /** Every other row of the file: its content is on record, or stands in this file before. */
  readonly same: readonly { readonly key: string; readonly line: number }[];
  readonly statusChanges: readonly StatusChange[];
  /** Pulsars whose live arrivals are not the same as before. */
  readonly pulsarsToDecide: readonly string[];
}

export interface AddedArrival {
  readonly key: string;
  readonly row: ReceivedRow;
  /** Key of the arrival that counted until now and whose value this one replaces. */
  readonly revises: string | null;
}

export interface StatusChange {
  readonly key: string;
  readonly status: ArrivalRecord['status'];
  readonly reason: string;
}

/** One content and where it stands. */
interface Statement {
  readonly key: string;
  readonly arrival: ReceivedRow | ArrivalRecord;
  /** Null: new content. */
  readonly record: ArrivalRecord | null;
  /** Last line of this file that states it; 0: none. */
  readonly line: number;
  /** This file did not say so before. */
  readonly isNews: boolean;
  readonly stands: boolean;
}

export function reconcile(delivery: Delivery): Reconciliation {
  const { rows, before, elsewhere } = delivery;
  const records = new Map([...delivery.onRecord, ...before].map((record) => [record.key, record]));
  const saidBefore = new Set(before.map(({ key }) => key));
  const firstRow = new Map<string, ReceivedRow>();
  const lastLine = new Map<string, number>();
  const same: { key: string; line: number }[] = [];
  for (const row of rows) {
    const key = arrivalKey(row);
    if (records.has(key) || firstRow.has(key)) same.push({ key, line: row.line });
    if (!firstRow.has(key)) firstRow.set(key, row);
    lastLine.set(key, row.line);
  }

  const statements: Statement[] = [];
  const state = (key: string, record: ArrivalRecord | null, arrival: ReceivedRow | ArrivalRecord) => {
    const line = lastLine.get(key) ?? 0;
    const stands = line > 0 || elsewhere.has(key);
    statements.push({ key, record, arrival, line, isNews: line > 0 && !saidBefore.has(key), stands });
  };
  for (const [key, record] of records) state(key, record, record);
  for (const [key, row] of firstRow) if (!records.has(key)) state(key, null, row);

  const changes: Changes = { added: [], statusChanges: [], pulsars: new Set() };
  for (const values of valuesOfOneArrival(statements)) {
    if (values.some(({ key, line }) => line > 0 || saidBefore.has(key))) settle(values, delivery.source, changes);
  }
  changes.added.sort((a, b) => a.row.line - b.row.line);
  return {
    added: changes.added,
    same,
    statusChanges: changes.statusChanges,
    pulsarsToDecide: [...changes.pulsars].sort(),
  };
}

/** Groups by measurement and then by time, in chains whose neighbours are within 1 µs: a grouping that no order can change. */
function valuesOfOneArrival(statements: readonly Statement[]): Statement[][] {
  const byMeasurement = new Map<string, Statement[]>();
  for (const statement of statements) {
    const measurement = measurementOf(statement.arrival);
    const group = byMeasurement.get(measurement);
    if (group === undefined) byMeasurement.set(measurement, [statement]);
    else group.push(statement);
  }
  return [...byMeasurement.values()].flatMap((group) =>
    chainsIn(group.sort((a, b) => compareMjd(a.arrival.time, b.arrival.time) || (a.key < b.key ? -1 : 1))),
  );
}

function chainsIn(inTimeOrder: readonly Statement[]): Statement[][] {
  const chains: Statement[][] = [];
  let last: Statement | null = null;
  for (const statement of inTimeOrder) {
    if (last !== null && isSameTime(last.arrival, statement.arrival)) chains.at(-1)!.push(statement);
    else chains.push([statement]);
    last = statement;
  }
  return chains;
}

interface Changes {
  readonly added: AddedArrival[];
  readonly statusChanges: StatusChange[];
  readonly pulsars: Set<string>;
}

/**
 * Decides which value counts, and notes what that changes. A value that no file states any more may have been the bridge between
 * others that are not within 1 µs of each other: those that stand are chained anew without it, and each chain has its own winner.
 */
function settle(values: readonly Statement[], source: string, changes: Changes): void {
  const winners: Statement[] = [];
  for (const chain of chainsIn(values.filter(({ stands }) => stands))) {
    const winner = winnerOf(chain);
    winners.push(winner);
    const replaced =
      chain.find(isLive) ??
      values.find((value) => isLive(value) && !value.stands && isSameTime(value.arrival, winner.arrival));
    for (const value of chain) {
      const revises = value === winner && replaced !== undefined ? replaced.key : null;
      if (value.record === null) changes.added.push({ key: value.key, row: value.arrival as ReceivedRow, revises });
      if (value === winner) setStatus(value, 'live', reasonToCount(value, source), changes);
      else setStatus(value, 'revised', reasonToYield(winner, source), changes);
    }
  }
  for (const gone of values.filter((value) => isLive(value) && !value.stands)) {
    const heir = winners.find((winner) => winner.isNews && isSameTime(winner.arrival, gone.arrival));
    if (heir === undefined) setStatus(gone, 'withdrawn', `no longer in ${source}`, changes);
    else setStatus(gone, 'revised', reasonToYield(heir, source), changes);
  }
}

function isLive({ record }: Statement): boolean {
  return record?.status === 'live';
}

/** A value with new content is live on the log unless it is told otherwise. */
function setStatus(value: Statement, status: ArrivalRecord['status'], reason: string, changes: Changes): void {
  if ((status === 'live') !== isLive(value)) changes.pulsars.add(value.arrival.pulsar);
  if (status !== (value.record?.status ?? 'live')) changes.statusChanges.push({ key: value.key, status, reason });
}

/** Of values that all stand: the latest news, else what counted, else what was taken in last. */
function winnerOf(chain: readonly Statement[]): Statement {
  const byLine = (a: Statement, b: Statement) => b.line - a.line;
  const byIntake = (a: Statement, b: Statement) =>
    (b.record?.fileId ?? 0) - (a.record?.fileId ?? 0) || (b.record?.line ?? 0) - (a.record?.line ?? 0);
  const news = chain.filter(({ isNews }) => isNews).sort(byLine);
  return news[0] ?? chain.find(isLive) ?? [...chain].sort(byIntake)[0]!;
}

function reasonToCount(value: Statement, source: string): string {
  return value.line > 0
    ? `stated again by ${source}, line ${value.line}`
    : `counts again: its revision is no longer in ${source}`;
}

function reasonToYield(winner: Statement, source: string): string {
  return winner.line > 0 ? `revised by ${source}, line ${winner.line}` : 'another value of this arrival counts';
}

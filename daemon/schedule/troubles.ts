import { statfsSync } from 'node:fs';
import { civilTime, mjdOf } from '../clock.ts';
import { clocksFault } from '../stages/clocks.ts';
import type { Station } from '../station.ts';
import { leapSecondWarning } from '../tables/loadTables.ts';
import { operatorTables } from '../tables/tableEnds.ts';

/** What is wrong with the watch itself, so that its silence would mean less than people think. Looked at now and then; `selfAlerts` tells of what begins. */
export interface Trouble {
  readonly kind: TroubleKind;
  /** The same while it lasts. */
  readonly key: string;
  /** For a person: what and where. */
  readonly line: string;
  /** Whom it is no use to tell. */
  readonly unreachable?: string;
}

export type TroubleKind =
  | 'files quarantined'
  | 'table ended'
  | 'disk nearly full'
  | 'count not settled'
  | 'clocks not judged'
  | 'mail blocked';

export interface TroubleSources extends Pick<Station, 'configuration' | 'store' | 'clock' | 'tables'> {
  /** Room for this user on the file system of a folder, bytes; absent: asks the system. */
  readonly freeBytes?: (folder: string) => number;
}

export function troubles(sources: TroubleSources): Trouble[] {
  return [
    ...quarantine(sources),
    ...endedTables(sources),
    ...disk(sources),
    ...unsettledCounts(sources),
    ...clocksNotJudged(sources),
    ...blockedMail(sources),
  ];
}

const HOUR_MS = 3_600_000;
const DAY_MS = 86_400_000;

/** One trouble a feed and civil date, however many files. */
function quarantine({ configuration, store, clock }: TroubleSources): Trouble[] {
  const since = new Date(clock.now().getTime() - DAY_MS).toISOString();
  const byKey = new Map<string, { readonly line: string; files: number }>();
  for (const { feed, path, rows, quarantined, fault, takenInAt } of store.unusableFilesSince(since)) {
    const { date } = civilTime(new Date(takenInAt), configuration.mail.timezone);
    const key = `${feed} ${date}`;
    const known = byKey.get(key);
    const why = fault ?? `${quarantined} of ${rows} rows could not be used`;
    if (known === undefined) byKey.set(key, { line: `feed ${feed}: ${path}: ${why}`, files: 1 });
    else known.files += 1;
  }
  return [...byKey].map(([key, { line, files }]) => {
    const more = files === 1 ? '' : ` (and ${files - 1} more of this feed)`;
    return { kind: 'files quarantined', key, line: `${line}${more}` };
  });
}

function endedTables({ configuration, clock, tables }: TroubleSources): Trouble[] {
  const today = mjdOf(clock.now());
  const leapSeconds = leapSecondWarning(tables.leapSeconds, today);
  const found: Trouble[] =
    leapSeconds === null ? [] : [{ kind: 'table ended', key: 'leap seconds', line: leapSeconds }];
  for (const { what, endsMjd, patienceDays, remedy } of operatorTables(configuration)) {
    if (endsMjd === null || today - endsMjd < patienceDays) continue;
    found.push({ kind: 'table ended', key: what, line: `${what} ended at MJD ${endsMjd}: ${remedy}` });
  }
  return found;
}

/** Beside what is written each night, an upgrade and a backup copy the record. */
const LEAST_FREE_BYTES = 500e6;

function disk(sources: TroubleSources): Trouble[] {
  const line = diskWarning(sources);
  return line === null ? [] : [{ kind: 'disk nearly full', key: 'state folder', line }];
}

/** For the morning review too; null: there is room. */
export function diskWarning({
  configuration,
  store,
  freeBytes = freeOnDisk,
}: Pick<TroubleSources, 'configuration' | 'store' | 'freeBytes'>): string | null {
  const free = freeBytes(configuration.stateFolder);
  const wanted = LEAST_FREE_BYTES + store.counts().bytes;
  if (free >= wanted) return null;
  const megabytes = (bytes: number) => `${Math.floor(bytes / 1e6)} MB`;
  return `only ${megabytes(free)} are free where the record lies (${configuration.stateFolder}); ${megabytes(wanted)} leave room for one copy of it`;
}

function freeOnDisk(folder: string): number {
  try {
    const { bavail, bsize } = statfsSync(folder);
    return bavail * bsize;
  } catch {
    // The record itself is looked at elsewhere.
    return Number.POSITIVE_INFINITY;
  }
}

/** From so many on a count ought to be settled: the model does not fit, or the count was lost. */
const ENOUGH_ARRIVALS = 20;

function unsettledCounts({ store }: TroubleSources): Trouble[] {
  return store
    .unlockedPulsars()
    .filter(({ arrivals }) => arrivals >= ENOUGH_ARRIVALS)
    .map(({ pulsar }) => ({ kind: 'count not settled', key: pulsar, line: pulsar }));
}

function clocksNotJudged({ store }: TroubleSources): Trouble[] {
  const fault = clocksFault(store);
  return fault === null ? [] : [{ kind: 'clocks not judged', key: 'all sites', line: fault }];
}

/** What waits for so long did not meet a short outage. */
const BLOCKED_AFTER_MS = HOUR_MS;

/** By recipient. Notices do not count: their own waiting would call for another. */
function blockedMail({ store, clock }: TroubleSources): Trouble[] {
  const before = new Date(clock.now().getTime() - BLOCKED_AFTER_MS).toISOString();
  const byRecipient = new Map<string, Trouble>();
  for (const { recipient, kind, attempts, mayLeaveAt, lastError } of store.outbox({ state: 'queued' })) {
    if (kind === 'notice' || attempts === 0 || mayLeaveAt > before || byRecipient.has(recipient)) continue;
    const line = `to ${recipient}, since ${mayLeaveAt}: ${lastError ?? 'the reason is not known'}`;
    byRecipient.set(recipient, { kind: 'mail blocked', key: recipient, line, unreachable: recipient });
  }
  return [...byRecipient.values()];
}

import { createHash } from 'node:crypto';
import { mjdOf } from '../clock.ts';
import type { ReceivedRow } from '../intake/rows.ts';
import type { Station } from '../station.ts';

/**
 * Rows that cannot be used yet: their pulsar has no model, their site is not known, or they are dated in the future. They are
 * quarantined, and leave marks in the signature of their file that say what they wait for. When that has come, the signature on
 * record no longer fits the file's, and it is read again by itself.
 */
export interface Waiting {
  /** For names that the configuration does not know. */
  readonly forNames: boolean;
  /** For a time: the earliest, MJD. */
  readonly forMjd: number | null;
}

/** A recorder's clock and ours may differ by less; an arrival from later than that says that one of them is wrong. */
const DAYS_AHEAD = 1;

/** Why a row must not be used before its time has come; null: it has. */
export function heldReason({ clock }: Station, { time }: ReceivedRow): string | null {
  const days = time.day + time.fraction - mjdOf(clock.now());
  if (days <= DAYS_AHEAD) return null;
  return `is dated ${days.toFixed(1)} days after the clock of this machine: held until that time has come; check both clocks`;
}

export function earlier(mjd: number | null, { time }: ReceivedRow): number {
  return Math.min(mjd ?? Number.POSITIVE_INFINITY, time.day + time.fraction);
}

export function marksOf(station: Station, { forNames, forMjd }: Waiting): string {
  return (forNames ? namesMark(station) : '') + (forMjd === null ? '' : ` held:${forMjd}`);
}

function namesMark({ configuration, sites }: Station): string {
  const names = JSON.stringify([[...configuration.models.keys()].sort(), [...sites.keys()].sort()]);
  return ` waiting:${createHash('sha256').update(names).digest('hex').slice(0, 16)}`;
}

/** A signature on record, taken apart. */
export interface MarkedSignature {
  /** What `stat` said. */
  readonly plain: string;
  readonly marks: string;
  /** What rows waited for is there: read the file again. */
  readonly isOver: boolean;
  readonly isHeld: boolean;
}

export function readMarks(station: Station, signature: string): MarkedSignature {
  const [marks = '', names = '', held = ''] = /( waiting:[0-9a-f]{16})?(?: held:([0-9.e+]+))?$/.exec(signature) ?? [];
  const hasCome = held !== '' && Number(held) <= mjdOf(station.clock.now()) + DAYS_AHEAD;
  return {
    plain: signature.slice(0, signature.length - marks.length),
    marks,
    isOver: hasCome || (names !== '' && names !== namesMark(station)),
    isHeld: held !== '',
  };
}

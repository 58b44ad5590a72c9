import type { PulsarEvent } from '../detectors/steps/pulsarEvent.ts';
import type { PlannedMessage } from './policy.ts';

/** Mail that was decided on may still be held for a while, or stand for others in one summary. Nothing of it is lost: the morning review names it. */

/** Times of day as a wall clock at the observatory shows them, `22:00`. */
export interface QuietHours {
  readonly from: string;
  readonly until: string;
  /** A step of more than this Δν/ν is mailed in the quiet hours too; null: none is. */
  readonly exceptAbove: number | null;
}

/** @param time of day, `HH:MM` or `HH:MM:SS`, between 00:00 and 24:00; quiet hours may go over midnight */
export function isQuiet(time: string, { from, until }: Pick<QuietHours, 'from' | 'until'>): boolean {
  return from < until ? time >= from && time < until : time >= from || time < until;
}

/**
 * Whether an event may wake somebody.
 * @param told as it was mailed last; what takes a large event back may wake as the event itself could
 */
export function mayWake(event: PulsarEvent, told: PulsarEvent | null, { exceptAbove }: QuietHours): boolean {
  if (exceptAbove === null) return false;
  return [event, told].some((version) => Math.abs(version?.deltaNuOverNu ?? 0) > exceptAbove);
}

export const DEFAULT_HOURLY_CAP = 10;

/**
 * Against a storm (a bad ephemeris, a fault at the site): the first `cap` event mails of an hour go out, then one summary says
 * that the rest waits on the page and in the digest. A withdrawal always goes out: a copy of what it takes back has left.
 *
 * @param recent event mails that may leave in the hour before this one, one per event and revision, not per recipient
 */
export function mailOrSummary(
  message: PlannedMessage,
  recent: { readonly eventMails: number; readonly summarySent: boolean },
  cap: number = DEFAULT_HOURLY_CAP,
): 'mail' | 'summary' | 'page only' {
  if (message.kind === 'withdrawal' || recent.eventMails < cap) return 'mail';
  return recent.summarySent ? 'page only' : 'summary';
}

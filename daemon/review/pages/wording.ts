import { dateOfMjd, mjdText } from '../../../alerts/wording/dates.ts';
import { percent } from '../../../alerts/wording/numbers.ts';
import type { EventState, PulsarEvent } from '../../../detectors/steps/pulsarEvent.ts';
import type { VerdictRecord } from '../../records.ts';

/** What only the page says; all that mail says too comes from the same words. */
export { visible } from '../../../alerts/markup.ts';
export { epochText } from '../../../alerts/wording/dates.ts';
export { plain, quantity } from '../../../alerts/wording/numbers.ts';
export { eventName, explanationName, stateText, subjectOf } from '../../../alerts/wording/phrases.ts';
export { eventSheet, sizeText } from '../../../alerts/wording/sheet.ts';
export { percent };

/** The mark stands beside the words, so that no state is told by colour alone. */
export const STATE_MARK: Readonly<Record<EventState, string>> = {
  suspected: '◇',
  confirmed: '◆',
  withdrawn: '–',
  accepted: '●',
  rejected: '○',
};

export const VERDICT_PAST: Readonly<Record<VerdictRecord['verdict'], string>> = {
  accept: 'accepted',
  reject: 'rejected',
  reopen: 'reopened',
};

export const ABSENT = '–';

/** The probability of the explanation that the event goes by; empty when it is not among those on record. */
export function ownProbability(event: PulsarEvent): string {
  const probability = event.explanations[event.explanation];
  return probability === undefined ? '' : percent(probability);
}

/** `MJD 60123.41` and its calendar day. */
export function mjdAndDay(mjd: number): readonly [mjd: string, day: string] {
  const date = dateOfMjd(mjd);
  return Number.isNaN(date.getTime()) ? [String(mjd), ''] : [mjdText(mjd), date.toISOString().slice(0, 10)];
}

/** ISO 8601 as a person reads it: `2026-12-01 04:22`, UTC. Text that is not a date is shown as it is. */
export function utc(iso: string): string {
  const instant = new Date(iso);
  return Number.isNaN(instant.getTime()) ? iso : instant.toISOString().slice(0, 16).replace('T', ' ');
}

/** Hours up to two days, then days: `7 h`, `2.4 d`, `41 d`. */
export function span(hours: number): string {
  if (Math.abs(hours) < 48) return `${hours.toFixed(Math.abs(hours) < 10 ? 1 : 0)} h`;
  const days = hours / 24;
  return `${days.toFixed(days < 30 ? 1 : 0)} d`;
}

export function count(value: number, one: string, many: string): string {
  return `${value} ${value === 1 ? one : many}`;
}

/** An event's own page. */
export function eventPath(id: string): string {
  return `/events/${encodeURIComponent(id)}`;
}

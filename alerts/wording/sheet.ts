import type { EventPicture, PulsarEvent, RecoveryTerm } from '../../detectors/steps/pulsarEvent.ts';
import { oneLine } from '../markup.ts';
import { CAUTION, rivalSizes, rivalText, whatToCheck, whatToObserve } from './advice.ts';
import { contextRows } from './context.ts';
import { civilEpoch, dateOfMjd, dayText, epochText, mjdText } from './dates.ts';
import { isConstrained, NOT_CONSTRAINED, percent, plain, quantity } from './numbers.ts';
import { eventName, explanationName, falseAlertText, meaningOf, stateText, subjectOf } from './phrases.ts';

/** All that is said about one event, in order, once: mail as text, mail as HTML and the page only set it in type. */
export interface EventSheet {
  /** `KR 0417+31: candidate glitch`. */
  readonly title: string;
  /** The one number: `Δν/ν = (3.20 ± 0.20) × 10⁻⁹`; empty for an event without a size. */
  readonly size: string;
  readonly meaning: string;
  readonly rows: readonly SheetRow[];
  /** Empty once a reviewer has decided. */
  readonly caution: string;
  readonly check: readonly string[];
  readonly observe: readonly string[];
}

export interface SheetRow {
  readonly label: string;
  readonly value: string;
}

export function eventSheet(event: PulsarEvent, picture: EventPicture | null, timezone: string): EventSheet {
  const decided = event.state === 'accepted' || event.state === 'rejected' || event.state === 'withdrawn';
  return {
    title: `${subjectOf(event)}: ${eventName(event)}`,
    size: sizeText(event),
    meaning: meaningOf(event),
    rows: [
      ...whenRows(event, picture, timezone),
      ...sizeRows(event),
      ...recoveryRows(event),
      ...trustRows(event),
      ...contextRows(event),
    ],
    caution: decided ? '' : CAUTION,
    check: decided ? [] : whatToCheck(event),
    observe: whatToObserve(event, picture),
  };
}

/** The size in one phrase, as subject line and lists show it. */
export function sizeText(event: PulsarEvent): string {
  if (event.deltaNuOverNu !== null)
    return `Δν/ν ${withRelation(event.deltaNuOverNu, event.deltaNuOverNuInterval68, '')}`;
  if (event.timeStepUs !== null) return `Δt ${relation(timeStep(event))}`;
  if (event.deltaNuDotOverNuDot !== null) {
    return `Δν̇/ν̇ ${withRelation(event.deltaNuDotOverNuDot, event.deltaNuDotOverNuDotInterval68, '')}`;
  }
  return '';
}

function withRelation(value: number, interval68: readonly [number, number] | null, unit: string): string {
  return isConstrained(value, interval68)
    ? relation(quantity({ value, interval68, unit, scale: 'power' }))
    : NOT_CONSTRAINED;
}

function relation(text: string): string {
  return text.startsWith(NOT_CONSTRAINED) ? text : `= ${text}`;
}

function whenRows(event: PulsarEvent, picture: EventPicture | null, timezone: string): SheetRow[] {
  const before = picture?.points.filter((p) => p.used && p.mjd <= picture.epochMjd).map((p) => p.mjd) ?? [];
  const on = (mjd: number) => `${mjdText(mjd)}, ${dayText(dateOfMjd(mjd), 'UTC')}`;
  return [
    { label: 'Epoch', value: epochText(event.epochMjd, event.epochInterval68) },
    { label: 'On the calendar', value: civilEpoch(event.epochMjd, event.epochInterval68, timezone) },
    ...(before.length === 0 ? [] : [{ label: 'Last arrival before', value: on(Math.max(...before)) }]),
    { label: 'First arrival after', value: on(event.firstArrivalMjd) },
    ...(event.confirmedAtMjd === null ? [] : [{ label: 'Confirmed by arrival', value: on(event.confirmedAtMjd) }]),
  ];
}

function sizeRows(event: PulsarEvent): SheetRow[] {
  const rows: SheetRow[] = [];
  if (event.timeStepUs !== null) rows.push({ label: 'Time step', value: `${timeStep(event)} (positive is late)` });
  if (event.deltaNuOverNu === null && event.deltaNuHz === null && event.deltaNuDot === null) return rows;
  const power = (label: string, value: number | null, interval68: readonly [number, number] | null, unit: string) =>
    rows.push({ label, value: quantity({ value, interval68, unit, scale: 'power' }) });
  power('Δν/ν', event.deltaNuOverNu, event.deltaNuOverNuInterval68, '');
  rows.push({
    label: 'Δν',
    value: quantity({ value: event.deltaNuHz, interval68: event.deltaNuHzInterval68, unit: 'Hz', scale: 'prefix' }),
  });
  power('Δν̇/ν̇', event.deltaNuDotOverNuDot, event.deltaNuDotOverNuDotInterval68, '');
  power('Δν̇', event.deltaNuDot, event.deltaNuDotInterval68, 'Hz s⁻¹');
  const rivals = rivalSizes(event);
  if (rivals.length > 0) {
    const more = rivals.length > 3 ? ` and ${rivals.length - 3} more` : '';
    rows.push({
      label: 'Or Δν',
      value: `${rivals.slice(0, 3).map(rivalText).join(', ')}${more}: whole turns not settled`,
    });
  }
  return rows;
}

function timeStep(event: PulsarEvent): string {
  const seconds = event.timeStepUsInterval68;
  const interval68 = seconds === null ? null : ([seconds[0] * 1e-6, seconds[1] * 1e-6] as const);
  return quantity({ value: (event.timeStepUs ?? 0) * 1e-6, interval68, unit: 's', scale: 'prefix' });
}

function recoveryRows(event: PulsarEvent): SheetRow[] {
  if (event.deltaNuHz === null) return [];
  if (event.recovery.terms.length === 0) return [{ label: 'Recovery', value: NOT_CONSTRAINED }];
  const rows = event.recovery.terms.map((term, i) => ({
    label: `${term.kind === 'delayed rise' ? 'Delayed rise' : 'Recovery'}${event.recovery.terms.length > 1 ? ` ${i + 1}` : ''}`,
    value: termText(term),
  }));
  return event.recovery.q === null || rows.length < 2
    ? rows
    : [...rows, { label: 'Recovered in all', value: `Q = ${plain(event.recovery.q, 2)}` }];
}

function termText(term: RecoveryTerm): string {
  const q = quantity({ value: term.fraction, interval68: term.fractionInterval68, unit: '', scale: 'power' });
  const tau = quantity({
    value: term.timescaleDays,
    interval68: term.timescaleDaysInterval68,
    unit: 'd',
    scale: 'power',
  });
  return term.kind === 'delayed rise' ? `Δνⱼ/Δν = ${q}, τ = ${tau}` : `Q = ${q}, τ = ${tau}`;
}

function trustRows(event: PulsarEvent): SheetRow[] {
  const ranked = Object.entries(event.explanations).toSorted((a, b) => b[1] - a[1]);
  const rivals = ranked.filter(([name, p]) => name !== event.explanation && p >= 1e-4).slice(0, 3);
  const own = event.explanations[event.explanation] ?? 0;
  const rows: SheetRow[] = [
    { label: 'Probability', value: `${percent(own)} ${event.explanation}` },
    {
      label: 'Otherwise',
      value:
        rivals.length === 0
          ? 'nothing above 0.01 %'
          : rivals.map(([name, p]) => `${explanationName(name)} ${percent(p)}`).join(', '),
    },
    {
      label: 'Evidence',
      value: `ln Bayes factor ${plain(event.logBayesFactor, 3)}, from ${event.arrivalsUsed} arrivals`,
    },
    { label: 'Chance', value: falseAlertText(event.falseAlertsPerYearAtThisLevel) },
  ];
  if (event.pulsars.length > 1) rows.push({ label: 'Seen in', value: event.pulsars.map(oneLine).join(', ') });
  rows.push({ label: 'State', value: stateText(event.state) }, { label: 'Event', value: oneLine(event.id) });
  return rows;
}

import type { EventPicture, PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import { oneLine } from '../markup.ts';
import { mjdText } from './dates.ts';
import { isConstrained, percent, quantity } from './numbers.ts';
import { isSiteEvent } from './phrases.ts';

/** What a person should do about an event: check it, then observe. */

export const CAUTION =
  'This is a candidate found by a program. It must be vetted by a person before it is announced or passed on.';

/** What to look at before accepting it. */
export function whatToCheck(event: PulsarEvent): string[] {
  if (isSiteEvent(event)) {
    return [
      'The site log for that night: clock, cabling, backend, firmware and software changes.',
      'The clock table of the site: does a correction for that date exist, and does it remove the step?',
      'Whether a pulsar observed at another site shows the step too: it should not.',
    ];
  }
  const common = [
    'Receivers: do all receivers and bands show it, and was one changed, moved or retuned?',
    'Clock: was the site clock stepped or its table changed that day?',
    'Other pulsars of that night: if they moved by the same time, it is the site and not the pulsar.',
    'A second site: does it see the same deviation?',
  ];
  if (event.explanation === 'lost count')
    return [
      'The arrivals before and after: a wrong start model, a mislabelled pulsar or a change of the file format loses the count too.',
      'Whether another group followed the pulsar through the gap: their count settles it at once.',
    ];
  if (event.explanation === 'mode switching')
    return [...common, 'The pulse profiles before and after: did the shape change?'];
  if (event.explanation === 'dispersion step')
    return [
      ...common,
      'Arrivals in two bands of the same day: does the delay scale as the inverse square of the frequency?',
    ];
  return [...common, 'The pulse profiles before and after: a change of shape can pass for a step.'];
}

/** Arrivals after the event that a fit of its recovery can rest on. */
const FEW_ARRIVALS_AFTER = 6;

/** What the next observation would settle, most urgent first. */
export function whatToObserve(event: PulsarEvent, picture: EventPicture | null): string[] {
  if (event.state === 'withdrawn' || event.state === 'rejected' || isSiteEvent(event)) return [];
  if (event.explanation === 'dispersion step')
    return ['Observe in two widely separated bands on one day: that tells dispersion from rotation.'];
  if (event.explanation === 'lost count')
    return [
      'Twice on one day, some hours apart, and again after one, three and ten days: that settles the count soonest.',
    ];
  const after = picture === null ? null : picture.points.filter((p) => p.used && p.mjd > picture.epochMjd).length;
  const advice: string[] = [];
  if (after !== null && after < FEW_ARRIVALS_AFTER) {
    const seen = after === 1 ? 'one arrival' : `${after} arrivals`;
    advice.push(
      `Tonight, and daily for two weeks: only ${seen} so far after the event, and a recovery of days is lost if it is not seen now.`,
    );
  }
  advice.push(...forAliases(event));
  if (event.deltaNuHz !== null && !isConstrained(event.deltaNuDot, event.deltaNuDotInterval68)) {
    advice.push('Weekly for two months: the change of the spin-down rate is not yet constrained.');
  }
  if (
    event.deltaNuHz !== null &&
    event.recovery.terms.length === 0 &&
    (after === null || after >= FEW_ARRIVALS_AFTER)
  ) {
    advice.push('Keep the raised cadence for four weeks: no recovery is established yet.');
  }
  const [low, high] = event.epochInterval68;
  if (high - low > 1) {
    advice.push(
      `Ask other sites for arrivals between ${mjdText(low)} and ${mjdText(high)}: they would narrow the epoch.`,
    );
  }
  return advice;
}

/** Two sizes that differ by δ separate by half a turn after 1/(2δ) seconds: a session so long after another tells them apart. */
function forAliases(event: PulsarEvent): string[] {
  const rivals = rivalSizes(event);
  const best = event.deltaNuHz;
  if (best === null || rivals.length === 0) return [];
  const nearest = Math.min(...rivals.map((r) => Math.abs(r.deltaNuHz - best)));
  const hours = 1 / (2 * nearest) / 3600;
  if (!Number.isFinite(hours)) return [];
  const gap = hours >= 1.5 ? `${hours.toFixed(1)} hours` : `${Math.max(1, Math.round(hours * 60))} minutes`;
  return [
    `Twice on one day, about ${gap} apart: the whole turns are not settled, and that tells the possible sizes apart.`,
  ];
}

/** The other sizes that are still possible, most probable first. */
export function rivalSizes(
  event: PulsarEvent,
): readonly { readonly deltaNuHz: number; readonly probability: number }[] {
  const best = event.deltaNuHz;
  if (best === null) return [];
  const [low, high] = event.deltaNuHzInterval95 ?? event.deltaNuHzInterval68 ?? [best, best];
  const width = Math.max(high - low, 1e-3 * Math.abs(best));
  return event.aliases
    .filter((a) => Math.abs(a.deltaNuHz - best) > width && a.probability >= 1e-4)
    .toSorted((a, b) => b.probability - a.probability);
}

export function rivalText(rival: { readonly deltaNuHz: number; readonly probability: number }): string {
  const size = quantity({
    value: rival.deltaNuHz,
    interval68: [rival.deltaNuHz, rival.deltaNuHz],
    unit: 'Hz',
    scale: 'prefix',
  });
  return oneLine(`${size} (${percent(rival.probability)})`);
}

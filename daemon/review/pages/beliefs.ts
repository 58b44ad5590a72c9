import { html } from 'hono/html';
import type { PulsarEvent } from '../../../detectors/steps/pulsarEvent.ts';
import type { EventChange } from '../../records.ts';
import { type Column, type Html, table } from './layout.ts';
import {
  ABSENT,
  explanationName,
  mjdAndDay,
  ownProbability,
  percent,
  quantity,
  sizeText,
  utc,
  visible,
} from './wording.ts';

/** Posterior probabilities, the most probable first, as bars with their numbers. */
export function explanationBars(event: PulsarEvent): Html {
  const ranked = Object.entries(event.explanations).toSorted(([, a], [, b]) => b - a);
  if (ranked.length === 0) return html`<p class="empty">No probabilities are on record.</p>`;
  return bars(ranked.map(([name, probability]) => ({ name: explanationName(name), probability })));
}

function bars(rows: readonly { readonly name: string; readonly probability: number }[]): Html {
  return html`<ul class="bars">${rows.map(
    ({ name, probability }) => html`<li>
      <span class="what">${name}</span>
      <svg class="bar" viewBox="0 0 100 4" preserveAspectRatio="none" aria-hidden="true" focusable="false"><rect class="track" width="100" height="4"/><rect class="fill" width="${(100 * probability).toFixed(2)}" height="4"/></svg>
      <span class="how">${percent(probability)}</span>
    </li>`,
  )}</ul>`;
}

/** Between sparse arrivals a whole number of turns can hide: the other step sizes that fit. */
export function sizeTable(event: PulsarEvent): Html {
  if (event.aliases.length === 0) return html``;
  const sizes = event.aliases.map(({ deltaNuHz, probability }) => ({
    name: quantity({ value: deltaNuHz, interval68: [deltaNuHz, deltaNuHz], unit: 'Hz', scale: 'prefix' }),
    probability,
  }));
  return html`<section aria-labelledby="sizes"><h2 id="sizes">Sizes Δν that fit</h2>
    <p class="lead">Whole turns may have been lost between arrivals; more arrivals settle it.</p>
    ${bars(sizes)}</section>`;
}

/** Every revision of the event, newest first. */
export function beliefTable(history: readonly EventChange[]): Html {
  return table({
    caption: 'How the belief changed',
    columns: BELIEFS,
    rows: history.toReversed(),
    empty: 'No earlier belief is on record.',
  });
}

function fractionText({ fraction, fractionInterval68 }: PulsarEvent['recovery']['terms'][number]): string {
  return quantity({ value: fraction, interval68: fractionInterval68, unit: '', scale: 'power' });
}

const BELIEFS: readonly Column<EventChange>[] = [
  { head: 'Revision', cell: (change) => String(change.revision), numeric: true },
  { head: 'When, UTC', cell: (change) => utc(change.at), whole: true },
  { head: 'What', cell: (change) => html`<span class="note">${visible(change.what)}</span>` },
  { head: 'State', cell: ({ event }) => event.state },
  {
    head: 'Explanation',
    cell: ({ event }) => html`${event.explanation} <small>${ownProbability(event)}</small>`,
  },
  { head: 'Epoch', cell: ({ event }) => mjdAndDay(event.epochMjd)[0] },
  { head: 'Size', cell: ({ event }) => sizeText(event) || ABSENT },
  {
    head: 'Δν̇/ν̇',
    cell: ({ event: { deltaNuDotOverNuDot: value, deltaNuDotOverNuDotInterval68: interval68 } }) =>
      value === null ? ABSENT : quantity({ value, interval68, unit: '', scale: 'power' }),
  },
  {
    head: 'Q',
    cell: ({ event }) => event.recovery.terms.map(fractionText).join(', ') || ABSENT,
  },
  { head: 'Arrivals', cell: ({ event }) => String(event.arrivalsUsed), numeric: true },
  { head: 'Mail', cell: ({ alert }) => alert ?? ABSENT },
];

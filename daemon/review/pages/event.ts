import { html } from 'hono/html';
import type { EventPlan } from '../../../detectors/index.ts';
import type { PulsarEvent } from '../../../detectors/steps/pulsarEvent.ts';
import type { ArrivalOrigin, EventRecord } from '../../records.ts';
import { beliefTable, explanationBars, sizeTable } from './beliefs.ts';
import { intervalTable } from './intervals.ts';
import type { Html } from './layout.ts';
import { originsTable } from './origins.ts';
import { planSection } from './plan.ts';
import { eventPlots } from './plots.ts';
import { conflictView, type VerdictSection, verdictForm } from './verdict.ts';
import {
  eventName,
  eventPath,
  eventSheet,
  STATE_MARK,
  stateText,
  subjectOf,
  utc,
  VERDICT_PAST,
  visible,
} from './wording.ts';

export interface EventContent {
  readonly record: EventRecord;
  readonly origins: readonly ArrivalOrigin[];
  readonly plan: EventPlan | null;
  /** In the order of the queue; null at its ends. */
  readonly neighbours: { readonly previous: PulsarEvent | null; readonly next: PulsarEvent | null };
}

/** One event: what is believed and how surely, the pictures, what they rest on, and the place to judge it. */
export function eventPage(content: EventContent, verdict: VerdictSection): Html {
  const { record, origins } = content;
  const { event } = record;
  const sheet = eventSheet(event, record.picture, 'UTC');
  return html`
    ${siblings(content)}
    <div data-fresh="subject"><header class="subject">
      <h1><bdi>${subjectOf(event)}</bdi>: ${eventName(event)}</h1>
      <p class="state"><span class="mark ${event.state}" aria-hidden="true">${STATE_MARK[event.state]}</span> ${stateText(event.state)} <small>revision ${record.revision}</small></p>
    </header>
    <p>${sheet.meaning}</p>
    ${sheet.caution === '' ? '' : html`<p class="caution">${sheet.caution}</p>`}</div>
    ${conflictView(record, verdict)}
    <div class="spread">
      <div class="evidence">
        <section data-fresh="numbers" aria-labelledby="numbers"><h2 id="numbers">In short</h2>
          <dl class="numbers">${sheet.rows.map(({ label, value }) => html`<div><dt>${label}</dt><dd>${value}</dd></div>`)}</dl>
        </section>
        <section data-fresh="plots" aria-labelledby="picture"><h2 id="picture">Phase, ν and ν̇</h2>${figures(record)}</section>
        <section data-fresh="intervals" aria-labelledby="intervals"><h2 id="intervals">Measured values</h2>${intervalTable(event)}</section>
        <div data-fresh="sizes">${sizeTable(event)}</div>
      </div>
      <div class="judgement">
        <div data-fresh="verdict-form">${verdictForm(record, verdict)}</div>
        <div data-fresh="todo">${todo('What to check', sheet.check)}
        ${todo('What to observe', sheet.observe)}</div>
        <section data-fresh="explanations" aria-labelledby="explanations"><h2 id="explanations">Explanations</h2>${explanationBars(event)}</section>
        ${downloads(record)}
      </div>
    </div>
    <div data-fresh="plan">${planSection(event, content.plan)}</div>
    <section data-fresh="verdicts" aria-labelledby="verdicts"><h2 id="verdicts">Verdicts</h2>${verdictList(record)}</section>
    <section data-fresh="history" aria-labelledby="history"><h2 id="history">How the belief changed</h2>${beliefTable(record.history)}</section>
    <section data-fresh="origins" aria-labelledby="origins"><h2 id="origins">What it rests on</h2>${originsTable(origins, record.picture)}</section>`;
}

function siblings({ neighbours: { previous, next } }: EventContent): Html {
  const link = (event: PulsarEvent | null, rel: 'prev' | 'next', words: string) =>
    event === null
      ? ''
      : html`<a rel="${rel}" href="${eventPath(event.id)}">${words}: <bdi>${subjectOf(event)}</bdi></a>`;
  return html`<nav class="siblings" data-fresh="siblings" aria-label="Queue"><a href="/">Tonight</a> ${link(previous, 'prev', 'Previous')} ${link(next, 'next', 'Next')} <a href="#verdict">Verdict</a></nav>`;
}

function todo(heading: string, lines: readonly string[]): Html {
  if (lines.length === 0) return html``;
  return html`<section><h2>${heading}</h2><ul class="todo">${lines.map((line) => html`<li>${line}</li>`)}</ul></section>`;
}

function figures({ picture }: EventRecord): Html {
  return picture === null ? html`<p class="empty">There is no picture of this event.</p>` : eventPlots(picture);
}

function downloads({ event }: EventRecord): Html {
  const base = eventPath(event.id);
  return html`<section class="downloads" aria-labelledby="downloads"><h2 id="downloads">Take away</h2>
    <ul class="inline">
      <li><a href="${base}/event.json" download>JSON</a></li>
      <li><a href="${base}/notice.xml" download>VOEvent</a></li>
      <li><a href="${base}/event.csv" download>CSV</a></li>
    </ul></section>`;
}

function verdictList({ verdicts }: EventRecord): Html {
  if (verdicts.length === 0) return html`<p class="empty">No verdict has been signed.</p>`;
  return html`<ol class="verdicts">${[...verdicts].reverse().map(
    (verdict) => html`<li>
      <p><strong>${VERDICT_PAST[verdict.verdict]}</strong> by <bdi>${visible(verdict.by)}</bdi>, <time datetime="${verdict.at}">${utc(verdict.at)} UTC</time> <small>revision ${verdict.revision}</small></p>
      ${verdict.note === '' ? '' : html`<blockquote class="note">${visible(verdict.note)}</blockquote>`}
    </li>`,
  )}</ol>`;
}

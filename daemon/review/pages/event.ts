import { html } from 'hono/html';
import type { EventRecord } from '../../records.ts';
import { beliefTable, explanationBars, sizeTable } from './beliefs.ts';
import type { Html } from './layout.ts';
import { eventPlot } from './plots.ts';
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

/** One event: what is believed and how surely, the picture, and the place to judge it. */
export function eventPage(record: EventRecord, verdict: VerdictSection): Html {
  const { event } = record;
  const sheet = eventSheet(event, record.picture, 'UTC');
  return html`
    <header class="subject">
      <h1><bdi>${subjectOf(event)}</bdi>: ${eventName(event)}</h1>
      <p class="state"><span class="mark ${event.state}" aria-hidden="true">${STATE_MARK[event.state]}</span> ${stateText(event.state)} <small>revision ${record.revision}</small></p>
    </header>
    <p>${sheet.meaning}</p>
    ${sheet.caution === '' ? '' : html`<p class="caution">${sheet.caution}</p>`}
    ${conflictView(record, verdict)}
    <div class="spread">
      <div class="evidence">
        <section aria-labelledby="numbers"><h2 id="numbers">Numbers</h2>
          <dl class="numbers">${sheet.rows.map(({ label, value }) => html`<div><dt>${label}</dt><dd>${value}</dd></div>`)}</dl>
        </section>
        <section aria-labelledby="picture"><h2 id="picture">Phase deviation and ν</h2>${figure(record)}</section>
        ${sizeTable(event)}
      </div>
      <div class="judgement">
        ${verdictForm(record, verdict)}
        ${todo('What to check', sheet.check)}
        ${todo('What to observe', sheet.observe)}
        <section aria-labelledby="explanations"><h2 id="explanations">Explanations</h2>${explanationBars(event)}</section>
        ${downloads(record)}
      </div>
    </div>
    <section aria-labelledby="verdicts"><h2 id="verdicts">Verdicts</h2>${verdictList(record)}</section>
    <section aria-labelledby="history"><h2 id="history">How the belief changed</h2>${beliefTable(record.history)}</section>`;
}

function todo(heading: string, lines: readonly string[]): Html {
  if (lines.length === 0) return html``;
  return html`<section><h2>${heading}</h2><ul class="todo">${lines.map((line) => html`<li>${line}</li>`)}</ul></section>`;
}

function figure(record: EventRecord): Html {
  const { event, picture } = record;
  const plot = eventPlot(record, `${subjectOf(event)}: ${eventName(event)}`);
  if (picture === null || plot === null) return html`<p class="empty">There is no picture of this event.</p>`;
  const aside = picture.points.filter((point) => !point.used).length;
  return html`<figure class="plot">
    <div class="crop">${plot}</div>
    <figcaption>Against the spin-down before the event. ${picture.points.length} arrivals, ${aside} of them set aside.</figcaption>
  </figure>`;
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

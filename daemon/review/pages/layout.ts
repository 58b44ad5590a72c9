import { html } from 'hono/html';
import type { WatchHealth } from '../desk.ts';
import { utc, visible } from './wording.ts';

export type Html = ReturnType<typeof html>;

export type Section = 'Tonight' | 'Pulsars' | 'Feeds' | 'Mail' | 'Health';

const SECTIONS: readonly { readonly name: Section; readonly path: string }[] = [
  { name: 'Tonight', path: '/' },
  { name: 'Pulsars', path: '/pulsars' },
  { name: 'Feeds', path: '/feeds' },
  { name: 'Mail', path: '/mail' },
  { name: 'Health', path: '/health' },
];

/** What every page of one moment shares. */
export interface Frame {
  readonly observatory: string;
  readonly now: Date;
  readonly version: string;
  readonly health: WatchHealth;
  /** Who is logged in; null: nobody logs in here. */
  readonly reviewer: string | null;
}

export interface PageContent {
  readonly title: string;
  readonly section: Section | null;
  readonly main: Html;
}

export function page(frame: Frame, content: PageContent): Html {
  return document({
    title: `${content.title} · ${visible(frame.observatory)}`,
    version: frame.version,
    live: true,
    body: html`
      <a class="skip" href="#main">Skip to the content</a>
      <header class="top">
        <p class="name"><span class="observatory">${visible(frame.observatory)}</span> <span class="quiet">spinvigil</span></p>
        <nav aria-label="Pages">
          ${SECTIONS.map(
            (section) =>
              html`<a href="${section.path}"${section.name === content.section ? html` aria-current="page"` : ''}>${section.name}</a>`,
          )}
        </nav>
        <p class="asof" data-fresh="as-of">as of <time datetime="${frame.now.toISOString()}">${utc(frame.now.toISOString())} UTC</time>${frame.reviewer === null ? '' : html` · <a href="/account"><bdi>${visible(frame.reviewer)}</bdi></a>`}</p>
        <p class="tools"><button type="button" id="light" hidden>Light</button> <button type="button" data-opens="keys" hidden>Keys</button></p>
      </header>
      <p id="live" class="live" role="status"></p>
      <div data-fresh="trouble">${healthBar(frame.health)}</div>
      <main id="main">${content.main}</main>
      <footer class="foot">
        <p>Intervals are 68 % where nothing else is said. Times are UTC; epochs are MJD (TDB) at the barycentre. Positive Δν is a spin-up.</p>
      </footer>
      ${keyHelp()}`,
  });
}

/** A page without anything from the desk, for refusals and faults. */
export function plainPage(title: string, lines: readonly string[]): Html {
  return plainDocument(
    title,
    html`<h1>${title}</h1>
        ${lines.map((line) => html`<p>${line}</p>`)}
        <p><a href="/">Start page</a></p>`,
  );
}

export function plainDocument(title: string, main: Html, head: Html = html``): Html {
  return document({
    title,
    version: '',
    live: false,
    head,
    body: html`
      <main id="main" class="plain">
        ${main}
      </main>`,
  });
}

function document(parts: { title: string; version: string; live: boolean; body: Html; head?: Html }): Html {
  return html`<!doctype html>
<html lang="en">
  <head>
    <meta charset="utf-8">
    <meta name="viewport" content="width=device-width, initial-scale=1">
    <meta name="color-scheme" content="light dark">
    <title>${parts.title}</title>
    ${parts.head ?? ''}
    <script src="/assets/theme.js"></script>
    <link rel="icon" href="/assets/mark.svg" type="image/svg+xml">
    <link rel="stylesheet" href="/assets/review.css">
    <script src="/assets/review.js" defer></script>
  </head>
  <body data-version="${parts.version}" data-live="${parts.live ? 'yes' : 'no'}">${parts.body}</body>
</html>`;
}

function healthBar(health: WatchHealth): Html {
  if (health.ok) return html``;
  return html`<section class="alarm" aria-label="Trouble with the watch">
    <p><strong>The watch needs attention</strong></p>
    <ul>${health.problems.map((problem) => html`<li>${visible(problem)}</li>`)}</ul>
  </section>`;
}

const KEYS: readonly (readonly [keys: readonly string[], does: string])[] = [
  [['j', 'k'], 'next and previous event, in a list and on an event’s page'],
  [['Enter'], 'opens the event that has the focus'],
  [['a', 'r'], 'on an event: accept or reject, and on to the note; nothing is signed yet'],
  [['o'], 'on a decided event: reopen'],
  [['Esc'], 'out of the note, and out of this help'],
  [['/'], 'on Pulsars: into the filter'],
  [['1', '5'], 'Tonight, Pulsars, Feeds, Mail, Health'],
  [['+', '−'], 'in a plot: zoom'],
  [['←', '→'], 'in a plot: earlier and later'],
  [['↑', '↓'], 'in a plot: the value before and after, in words'],
  [['0'], 'in a plot: all of it again'],
  [['?'], 'this help'],
];

function keyHelp(): Html {
  return html`<dialog id="keys" aria-labelledby="keys-heading">
        <h2 id="keys-heading">Keys</h2>
        <dl class="key-list">${KEYS.map(
          ([keys, does]) => html`<div><dt>${keys.map((key) => html`<kbd>${key}</kbd> `)}</dt><dd>${does}</dd></div>`,
        )}</dl>
        <p id="chart-keys">In a plot: plus and minus zoom, left and right move, up and down tell the values one by one, 0 shows all.</p>
        <form method="dialog"><button>Close</button></form>
      </dialog>`;
}

export interface Column<Row> {
  readonly head: string;
  readonly cell: (row: Row) => Html | string;
  readonly numeric?: true;
  /** Kept on one line where the width allows. */
  readonly whole?: true;
}

/** One table for the whole page; on a phone each row becomes a card, its cells labelled by their column. */
export function table<Row>(options: {
  readonly caption: string;
  readonly columns: readonly Column<Row>[];
  readonly rows: readonly Row[];
  readonly empty: string;
}): Html {
  if (options.rows.length === 0) return html`<p class="empty">${options.empty}</p>`;
  return html`<table>
    <caption class="unseen">${options.caption}</caption>
    <thead><tr>${options.columns.map((column) => html`<th scope="col"${classOf(column)}>${column.head}</th>`)}</tr></thead>
    <tbody>${options.rows.map(
      (row) =>
        html`<tr>${options.columns.map((column) => html`<td data-head="${column.head}"${classOf(column)}><div>${column.cell(row)}</div></td>`)}</tr>
        `,
    )}</tbody>
  </table>`;
}

function classOf<Row>(column: Column<Row>): Html {
  if (column.numeric) return html` class="number"`;
  return column.whole ? html` class="whole"` : html``;
}

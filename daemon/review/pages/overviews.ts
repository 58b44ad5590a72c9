import { html } from 'hono/html';
import type { QuarantinedRow } from '../../../alerts/morningReview.ts';
import type { FileRecord } from '../../records.ts';
import type { FeedOverview, OutboxLine } from '../desk.ts';
import { type Column, type Html, table } from './layout.ts';
import { ABSENT, eventPath, span, utc, visible } from './wording.ts';

/** The pages that only report: feeds and mail. */

export interface FeedsContent {
  readonly feeds: readonly FeedOverview[];
  readonly quarantine: readonly QuarantinedRow[];
  readonly files: readonly FileRecord[];
  /** The lists are cut at this many. */
  readonly most: number;
}

export function feedsPage(content: FeedsContent): Html {
  return html`
    <h1>Feeds</h1>
    <div data-fresh="feeds">${table({ caption: 'Feeds', columns: FEEDS, rows: content.feeds, empty: 'No feed is configured.' })}</div>
    <section data-fresh="quarantine" aria-labelledby="quarantine">
      <h2 id="quarantine">Quarantine</h2>
      <p class="lead">Rows and files that could not be used, newest first${cutAt(content.quarantine, content.most)}. Deliver the file again at the same path to replace what it said.</p>
      ${table({ caption: 'Quarantine', columns: QUARANTINE, rows: content.quarantine, empty: 'Nothing is quarantined.' })}
    </section>
    <section data-fresh="files" aria-labelledby="files">
      <h2 id="files">Files taken in</h2>
      <p class="lead">Newest first${cutAt(content.files, content.most)}.</p>
      ${table({ caption: 'Files taken in', columns: FILES, rows: content.files, empty: 'No file has been taken in yet.' })}
    </section>`;
}

export function mailPage(outbox: readonly OutboxLine[], most: number): Html {
  return html`
    <h1>Mail</h1>
    <p class="lead">Every message and what became of it, newest first${cutAt(outbox, most)}.</p>
    <div data-fresh="mail">${table({ caption: 'Mail', columns: MAIL, rows: outbox, empty: 'No mail has been written yet.' })}</div>`;
}

function cutAt(rows: readonly unknown[], most: number): string {
  return rows.length < most ? '' : `, the last ${most}`;
}

const FEEDS: readonly Column<FeedOverview>[] = [
  { head: 'Feed', cell: (row) => html`<bdi>${visible(row.feed)}</bdi>` },
  { head: 'Last file, UTC', cell: (row) => (row.lastFileAt === null ? ABSENT : utc(row.lastFileAt)), whole: true },
  {
    head: 'How long ago',
    cell: (row) => (row.hoursSince === null ? 'nothing yet' : span(Math.max(0, row.hoursSince))),
    numeric: true,
  },
  {
    head: 'Expected every',
    cell: (row) => (row.expectEveryHours === null ? ABSENT : span(row.expectEveryHours)),
    numeric: true,
  },
  { head: 'State', cell: (row) => (row.silent ? html`<strong class="attention">silent</strong>` : 'on time') },
];

const QUARANTINE: readonly Column<QuarantinedRow>[] = [
  { head: 'When, UTC', cell: (row) => utc(row.at), whole: true },
  { head: 'Feed', cell: (row) => html`<bdi>${visible(row.feed)}</bdi>` },
  { head: 'File', cell: (row) => html`<bdi class="path">${visible(row.file)}</bdi>` },
  { head: 'Line', cell: (row) => (row.line === null ? 'whole file' : String(row.line)), numeric: true },
  { head: 'Reason', cell: (row) => html`<bdi>${visible(row.reason)}</bdi>` },
];

const FILES: readonly Column<FileRecord>[] = [
  { head: 'When, UTC', cell: (row) => utc(row.takenInAt), whole: true },
  { head: 'Feed', cell: (row) => html`<bdi>${visible(row.feed)}</bdi>` },
  { head: 'File', cell: (row) => html`<bdi class="path">${visible(row.path)}</bdi>` },
  { head: 'Rows', cell: (row) => String(row.rows), numeric: true },
  { head: 'Stored', cell: (row) => String(row.stored), numeric: true },
  { head: 'Known before', cell: (row) => String(row.same), numeric: true },
  { head: 'Revised', cell: (row) => String(row.revised), numeric: true },
  {
    head: 'Quarantined',
    cell: (row) => (row.quarantined === 0 ? '0' : html`<strong class="attention">${row.quarantined}</strong>`),
    numeric: true,
  },
  {
    head: 'Fault',
    cell: (row) =>
      row.fault === null ? ABSENT : html`<strong class="attention"><bdi>${visible(row.fault)}</bdi></strong>`,
  },
];

const MAIL: readonly Column<OutboxLine>[] = [
  { head: 'Written, UTC', cell: (row) => utc(row.createdAt), whole: true },
  { head: 'To', cell: (row) => html`<bdi>${visible(row.recipient)}</bdi>`, whole: true },
  {
    head: 'Subject',
    cell: (row) =>
      row.eventId === null
        ? html`<bdi>${visible(row.subject)}</bdi>`
        : html`<a href="${eventPath(row.eventId)}"><bdi>${visible(row.subject)}</bdi></a>`,
  },
  { head: 'Kind', cell: (row) => row.kind },
  { head: 'State', cell: mailState },
  { head: 'Attempts', cell: attempts },
];

/** Each with its end; of those from before they were kept, the number and the last error. */
function attempts({ attempts: number, tries, lastError }: OutboxLine): Html | string {
  if (tries.length === 0) {
    if (number === 0) return lastError === null ? 'none yet' : html`<bdi>${visible(lastError)}</bdi>`;
    return html`${number}${lastError === null ? '' : html`, the last: <bdi>${visible(lastError)}</bdi>`}`;
  }
  return html`<ol class="tries">${tries.map(
    ({ begunAt, outcome }) =>
      html`<li><small>${utc(begunAt)}</small> <bdi>${outcome === null ? 'under way' : visible(outcome)}</bdi></li>`,
  )}</ol>`;
}

function mailState(row: OutboxLine): Html | string {
  switch (row.state) {
    case 'delivered':
      return row.deliveredAt === null ? 'delivered' : html`delivered <small>${utc(row.deliveredAt)}</small>`;
    case 'queued':
      return html`queued <small>next try ${utc(row.dueAt)}${row.possibleDuplicate ? ', marked as possible duplicate' : ''}</small>`;
    case 'attempting':
      return 'being sent';
    case 'refused':
    case 'expired':
      return html`<strong class="attention">${row.state}</strong>`;
  }
}

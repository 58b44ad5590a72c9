import { html } from 'hono/html';
import type { EventPicture } from '../../../detectors/steps/pulsarEvent.ts';
import type { ArrivalOrigin } from '../../records.ts';
import { type Column, type Html, table } from './layout.ts';
import { count, plain, utc, visible } from './wording.ts';

/** The arrivals that an event's picture shows, each with the file and row that brought it. */
export function originsTable(origins: readonly ArrivalOrigin[], picture: EventPicture | null): Html {
  if (origins.length === 0) return html`<p class="empty">No single arrivals are on record for this event.</p>`;
  const used = new Map(picture?.points.map((point) => [point.key, point.used]));
  const files = new Set(origins.map(({ feed, file }) => `${feed}\n${file}`)).size;
  const rows = origins.map((origin) => ({ ...origin, used: used.get(origin.key) ?? false })).toReversed();
  return html`<details><summary>${count(origins.length, 'arrival', 'arrivals')} from ${count(files, 'file', 'files')}</summary>
    ${table({ caption: 'Arrivals and where they came from', columns: COLUMNS, rows, empty: '' })}</details>`;
}

type Row = ArrivalOrigin & { readonly used: boolean };

const COLUMNS: readonly Column<Row>[] = [
  {
    head: 'MJD as received',
    cell: (row) => html`<bdi>${visible(row.timeText)}</bdi> <small>${row.timeScale}</small>`,
    whole: true,
  },
  { head: 'Site', cell: (row) => html`<bdi>${visible(row.site)}</bdi>` },
  { head: 'Receiver', cell: (row) => html`<bdi>${visible(row.receiver)}</bdi>` },
  {
    head: 'MHz',
    cell: (row) => (Number.isFinite(row.frequencyMhz) ? plain(row.frequencyMhz, 5) : 'infinite'),
    numeric: true,
  },
  { head: '± µs', cell: (row) => plain(row.uncertaintyUs, 3), numeric: true },
  { head: 'Fate', cell: fate },
  { head: 'Feed', cell: (row) => html`<bdi>${visible(row.feed)}</bdi>` },
  { head: 'File', cell: (row) => html`<bdi class="path">${visible(row.file)}</bdi>` },
  { head: 'Line', cell: (row) => String(row.line), numeric: true },
  { head: 'Taken in, UTC', cell: (row) => utc(row.takenInAt), whole: true },
];

function fate(row: Row): string {
  if (row.status !== 'live') return row.status;
  return row.used ? 'used' : 'set aside';
}

import { html } from 'hono/html';
import type { HeartbeatSign, StageSign, TableSign, VitalSigns } from '../desk.ts';
import { type Column, type Html, table } from './layout.ts';
import { ABSENT, mjdAndDay, span, utc, visible } from './wording.ts';

/** The page Health: whether the watch itself is alive, and what it stands on. */
export function healthPage(signs: VitalSigns, now: Date): Html {
  const { program, node, sqlite } = signs.versions;
  const upHours = (now.getTime() - Date.parse(signs.startedAt)) / HOUR_MS;
  return html`
    <h1>Health</h1>
    <div data-fresh="vital">
    <dl class="numbers">
      <div><dt>Version</dt><dd>${program}</dd></div>
      <div><dt>Node</dt><dd>${node}</dd></div>
      <div><dt>SQLite</dt><dd>${sqlite}</dd></div>
      <div><dt>Running for</dt><dd>${span(Math.max(0, upHours))}</dd></div>
      <div><dt>Record</dt><dd>${mebibytes(signs.recordBytes)}</dd></div>
      <div><dt>Memory</dt><dd>${mebibytes(signs.residentBytes)}</dd></div>
    </dl>
    <section aria-labelledby="stages">
      <h2 id="stages">Parts of the watch</h2>
      <p class="lead">Each must go on making progress; while one does not, no heartbeat leaves.</p>
      ${table({ caption: 'Parts of the watch', columns: STAGES, rows: signs.stages, empty: 'Nothing runs.' })}
    </section>
    <section aria-labelledby="tables">
      <h2 id="tables">Tables</h2>
      ${table({ caption: 'Tables', columns: TABLES, rows: signs.tables, empty: 'No tables.' })}
    </section>
    <section aria-labelledby="heartbeats">
      <h2 id="heartbeats">Heartbeat</h2>
      ${table({ caption: 'Heartbeat', columns: HEARTBEATS, rows: signs.heartbeats, empty: 'None is configured: if the machine dies, nobody is told.' })}
    </section>
    </div>`;
}

const HOUR_MS = 3_600_000;
const MEBIBYTE = 2 ** 20;

function mebibytes(bytes: number): string {
  return `${(bytes / MEBIBYTE).toFixed(1)} MiB`;
}

function seconds(value: number): string {
  if (value < 120) return `${Math.round(value)} s`;
  return value < 7200 ? `${Math.round(value / 60)} min` : span(value / 3600);
}

const STAGES: readonly Column<StageSign>[] = [
  { head: 'Part', cell: (row) => html`<bdi>${visible(row.name)}</bdi>` },
  {
    head: 'State',
    cell: (row) => {
      if (row.late) return html`<strong class="attention">no progress</strong>`;
      return row.resting ? 'nothing to do' : 'at work';
    },
  },
  { head: 'Last progress', cell: (row) => `${seconds(row.secondsSinceProgress)} ago`, numeric: true },
  { head: 'Limit', cell: (row) => seconds(row.limitSeconds), numeric: true },
];

const TABLES: readonly Column<TableSign>[] = [
  { head: 'Table', cell: (row) => html`<bdi>${visible(row.name)}</bdi>` },
  {
    head: 'Good until',
    cell: (row) => {
      if (row.endsMjd === null) return 'no end';
      const [mjd, day] = mjdAndDay(row.endsMjd);
      return html`${mjd} <small>${day}</small>`;
    },
  },
  {
    head: 'State',
    cell: (row) => (row.state === 'good' ? 'good' : html`<strong class="attention">${row.state}</strong>`),
  },
];

const HEARTBEATS: readonly Column<HeartbeatSign>[] = [
  { head: 'Way', cell: (row) => row.way },
  { head: 'Last sent, UTC', cell: (row) => (row.lastSentAt === null ? ABSENT : utc(row.lastSentAt)), whole: true },
  {
    head: 'State',
    cell: (row) =>
      row.trouble === null ? 'sent' : html`<strong class="attention"><bdi>${visible(row.trouble)}</bdi></strong>`,
  },
];

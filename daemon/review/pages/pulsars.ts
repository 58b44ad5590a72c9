import { html, raw } from 'hono/html';
import type { NoiseModel } from '../../../detectors/report.ts';
import { sparkline } from '../charts/sparkline.ts';
import { PULSAR_STATES, type PulsarOverview, type PulsarState } from '../desk.ts';
import type { Html } from './layout.ts';
import { ABSENT, eventPath, mjdAndDay, plain, quantity, span, visible } from './wording.ts';

/** The list as its address asks for it; the script in the page sorts and filters the same rows on the spot. */
export interface PulsarQuery {
  readonly sort: string;
  readonly descending: boolean;
  readonly text: string;
  readonly state: PulsarState | '';
}

const LONGEST_TEXT = 100;

export function pulsarQuery(query: Readonly<Record<string, string>>): PulsarQuery {
  const state = PULSAR_STATES.find((name) => name === query['state']) ?? '';
  return {
    sort: COLUMNS.some(({ by }) => by === query['sort']) ? query['sort']! : 'state',
    descending: query['order'] === 'descending',
    text: (query['text'] ?? '').trim().slice(0, LONGEST_TEXT),
    state,
  };
}

export function pulsarsPage(pulsars: readonly PulsarOverview[], query: PulsarQuery): Html {
  if (pulsars.length === 0) return html`<h1>Pulsars</h1><p class="empty">No pulsar is configured.</p>`;
  const matches = (row: PulsarOverview) =>
    wordsOf(row).includes(query.text.toLowerCase()) && (query.state === '' || row.state === query.state);
  return html`
    <h1>Pulsars</h1>
    <p class="lead">What silence is worth: the smallest glitch that would have been confirmed with 90 % probability, and how long that would have taken.</p>
    <form class="filter" method="get" action="/pulsars" role="search">
      <label for="text">Name or state</label> <input id="text" type="search" name="text" value="${query.text}" maxlength="${LONGEST_TEXT}" autocomplete="off">
      <label for="state">State</label> <select id="state" name="state"><option value="">all</option>${PULSAR_STATES.map(
        (name) => html`<option value="${name}"${name === query.state ? html` selected` : ''}>${name}</option>`,
      )}</select>
      <input type="hidden" name="sort" value="${query.sort}">
      <input type="hidden" name="order" value="${query.descending ? 'descending' : ''}">
      <button type="submit">Show</button>
      <span id="shown" class="quiet" role="status">${pulsars.filter(matches).length} of ${pulsars.length} shown</span>
    </form>
    <div data-fresh="pulsars"><table data-list>
      <caption class="unseen">Pulsars</caption>
      <thead><tr>${COLUMNS.map((column) => headCell(column, query))}</tr></thead>
      <tbody>${sorted(pulsars, query).map(
        (
          row,
        ) => html`<tr data-text="${wordsOf(row)}" data-state="${row.state}"${matches(row) ? '' : html` hidden`}>${COLUMNS.map((column) => cellOf(column, row))}</tr>
        `,
      )}</tbody>
    </table></div>`;
}

interface Column {
  readonly by: string;
  readonly head: string;
  readonly cell: (row: PulsarOverview) => Html | string;
  /** Null: not known, and last whichever way the list is sorted. */
  readonly value: (row: PulsarOverview) => number | string | null;
  readonly numeric: boolean;
}

function headCell(column: Column, { sort, descending, text, state }: PulsarQuery): Html {
  const isSorted = column.by === sort;
  const order = isSorted && !descending ? 'descending' : '';
  const address = `?${new URLSearchParams({ sort: column.by, order, text, state })}`;
  return html`<th scope="col"${column.numeric ? html` class="number"` : ''}${isSorted ? html` aria-sort="${descending ? 'descending' : 'ascending'}"` : ''}><a href="${address}" data-by="${column.by}">${column.head}</a></th>`;
}

function cellOf(column: Column, row: PulsarOverview): Html {
  return html`<td data-head="${column.head}" data-sort="${column.value(row) ?? ''}"${column.numeric ? html` class="number"` : ''}><div>${column.cell(row)}</div></td>`;
}

function sorted(pulsars: readonly PulsarOverview[], { sort, descending }: PulsarQuery): PulsarOverview[] {
  const { value } = COLUMNS.find(({ by }) => by === sort) ?? COLUMNS[0]!;
  const sign = descending ? -1 : 1;
  return pulsars.toSorted((one, other) => {
    const [a, b] = [value(one), value(other)];
    if (a === null || b === null) return Number(a === null) - Number(b === null);
    return a === b ? 0 : sign * (a < b ? -1 : 1);
  });
}

function wordsOf({ pulsar, state }: PulsarOverview): string {
  return `${visible(pulsar)} ${state}`.toLowerCase();
}

const COLUMNS: readonly Column[] = [
  { by: 'name', head: 'Pulsar', cell: name, value: (row) => row.pulsar, numeric: false },
  {
    by: 'state',
    head: 'State',
    cell: state,
    // The most urgent first, and among equals by name.
    value: (row) => `${PULSAR_STATES.indexOf(row.state)} ${row.pulsar}`,
    numeric: false,
  },
  { by: 'deviation', head: 'Deviation', cell: picture, value: (row) => largestDeviation(row), numeric: true },
  { by: 'last', head: 'Last arrival', cell: lastArrival, value: (row) => row.lastArrivalMjd, numeric: true },
  {
    by: 'cadence',
    head: 'Every',
    cell: ({ recent }) => (recent?.everyDays == null ? ABSENT : span(recent.everyDays * 24)),
    value: (row) => row.recent?.everyDays ?? null,
    numeric: true,
  },
  { by: 'noise', head: 'Noise in 100 d', cell: noise, value: wanderSeconds, numeric: true },
  { by: 'limit', head: 'Smallest Δν/ν', cell: limit, value: (row) => row.deltaNuOverNu90, numeric: true },
  {
    by: 'delay',
    head: 'Confirmed after',
    cell: (row) => (row.delayDays90 === null ? ABSENT : span(row.delayDays90 * 24)),
    value: (row) => row.delayDays90,
    numeric: true,
  },
];

function name({ pulsar, eventId }: PulsarOverview): Html {
  const text = html`<bdi>${visible(pulsar)}</bdi>`;
  return eventId === null ? text : html`<a class="event" href="${eventPath(eventId)}">${text}</a>`;
}

function state({ state }: PulsarOverview): Html | string {
  switch (state) {
    case 'candidate':
      return html`<strong class="attention">candidate waits</strong>`;
    case 'count open':
      return html`<strong class="attention">pulse count open</strong> <small>alerts are held</small>`;
    default:
      return state;
  }
}

function picture({ recent, frequencyHz }: PulsarOverview): Html | string {
  if (recent === null || recent.points.length < 2) return ABSENT;
  const reach = largest(recent.points);
  const says = `last ${recent.points.length} arrivals, within ${seconds(reach / frequencyHz)}`;
  // The drawing holds numbers and these words of ours alone.
  return html`${raw(sparkline(recent, says))} <small>± ${seconds(reach / frequencyHz)}</small>`;
}

function largest(points: NonNullable<PulsarOverview['recent']>['points']): number {
  return Math.max(0, ...points.map(([, turns, , isUsed]) => (isUsed ? Math.abs(turns) : 0)));
}

function largestDeviation({ recent, frequencyHz }: PulsarOverview): number | null {
  return recent === null || recent.points.length < 2 ? null : largest(recent.points) / frequencyHz;
}

function lastArrival({ lastArrivalMjd }: PulsarOverview): Html | string {
  if (lastArrivalMjd === null) return ABSENT;
  const [mjd, day] = mjdAndDay(lastArrivalMjd);
  return html`${mjd} <small>${day}</small>`;
}

/** What timing noise adds to an arrival time, and the factor on the stated errors. */
function noise(row: PulsarOverview): Html | string {
  const wander = wanderSeconds(row);
  if (wander === null || row.noise === null) return ABSENT;
  return html`${seconds(wander)} <small>errors × ${plain(row.noise.uncertaintyScale, 3)}</small>`;
}

function wanderSeconds({ noise, frequencyHz }: PulsarOverview): number | null {
  return noise === null ? null : wanderTurns(noise, NOISE_DAYS) / frequencyHz;
}

const NOISE_DAYS = 100;

/** Standard deviation after T of once, twice and three times integrated white noise: T, T³/3, T⁵/20 times their strengths. */
function wanderTurns({ phaseWalk, frequencyWalk, torqueWalk }: NoiseModel, days: number): number {
  return Math.sqrt(phaseWalk * days + (frequencyWalk * days ** 3) / 3 + (torqueWalk * days ** 5) / 20);
}

function limit({ deltaNuOverNu90: size, limitReason }: PulsarOverview): Html | string {
  if (size !== null) return quantity({ value: size, interval68: [size, size], unit: '', scale: 'power' });
  return limitReason === null ? 'not yet known' : html`<small class="why">${visible(limitReason)}</small>`;
}

function seconds(value: number): string {
  return quantity({ value, interval68: [value, value], unit: 's', scale: 'prefix' });
}

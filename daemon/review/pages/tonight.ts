import { html } from 'hono/html';
import type { MorningReview } from '../../../alerts/morningReview.ts';
import { falseAlertLines } from '../../../alerts/wording/falseAlerts.ts';
import type { PulsarEvent } from '../../../detectors/steps/pulsarEvent.ts';
import type { Decision, PulsarOverview } from '../desk.ts';
import { type Column, type Html, table } from './layout.ts';
import {
  ABSENT,
  count,
  eventName,
  eventPath,
  mjdAndDay,
  ownProbability,
  plain,
  quantity,
  STATE_MARK,
  sizeText,
  span,
  subjectOf,
  utc,
  VERDICT_PAST,
  visible,
} from './wording.ts';

export interface TonightContent {
  readonly morning: MorningReview;
  readonly decisions: readonly Decision[];
  readonly pulsars: readonly PulsarOverview[];
}

/** The first page: is anything waiting, is the watch well, what was decided lately. */
export function tonightPage(content: TonightContent): Html {
  const { morning } = content;
  return html`
    <h1 class="headline">${headline(content)}</h1>
    ${glance(content)}
    ${warnings(morning)}
    <section aria-labelledby="waiting">
      <h2 id="waiting">Waiting for a verdict</h2>
      <p class="lead">Most credible first. A candidate must be vetted before it is announced.</p>
      ${table({ caption: 'Waiting for a verdict', columns: QUEUE, rows: morning.waiting, empty: 'No candidate waits.' })}
    </section>
    <section aria-labelledby="suspected">
      <h2 id="suspected">Suspected</h2>
      <p class="lead">Not yet credible enough to call; the next arrivals decide.</p>
      ${table({ caption: 'Suspected', columns: QUEUE, rows: morning.suspected, empty: 'Nothing is suspected.' })}
    </section>
    <section aria-labelledby="decided">
      <h2 id="decided">Recently decided</h2>
      ${table({
        caption: 'Recently decided',
        columns: DECIDED,
        rows: content.decisions,
        empty: 'Nothing has been decided yet.',
      })}
    </section>
    <section aria-labelledby="false-alerts">
      <h2 id="false-alerts">False alerts</h2>
      ${falseAlertLines(morning.falseAlerts).map((line) => html`<p class="lead">${line}</p>`)}
    </section>
    <p class="keys quiet">Keys: <kbd>j</kbd> next event, <kbd>k</kbd> previous, <kbd>Enter</kbd> opens it.</p>`;
}

function headline({ morning, pulsars }: TonightContent): string {
  const watched = `${count(pulsars.length, 'pulsar', 'pulsars')} watched`;
  if (morning.waiting.length > 0) {
    const waiting = morning.waiting.length;
    return `${count(waiting, 'candidate waits', 'candidates wait')} for a verdict; ${watched}.`;
  }
  if (morning.suspected.length > 0) return `No candidate waits; ${morning.suspected.length} suspected; ${watched}.`;
  return `Quiet: no candidate waits, nothing is suspected; ${watched}.`;
}

function glance({ morning, pulsars }: TonightContent): Html {
  const silentFeeds = morning.silentFeeds.map((feed) => `${feed.feed}: ${span(feed.hoursSilent)}`);
  const tiles: Tile[] = [
    {
      label: 'Taken in',
      value: count(morning.intake.arrivals, 'arrival', 'arrivals'),
      detail: `${count(morning.intake.files, 'file', 'files')} since ${utc(morning.since)} UTC`,
      link: '/feeds',
      alert: false,
    },
    {
      label: 'Silent feeds',
      value: String(morning.silentFeeds.length),
      detail: silentFeeds.length === 0 ? 'every feed is on time' : silentFeeds.join('; '),
      link: '/feeds',
      alert: morning.silentFeeds.length > 0,
    },
    {
      label: 'Silent pulsars',
      value: String(morning.silentPulsars.length),
      detail: longestSilence(morning),
      link: '/pulsars',
      alert: morning.silentPulsars.length > 0,
    },
    {
      label: 'Pulse count open',
      value: String(morning.unlockedPulsars.length),
      detail:
        morning.unlockedPulsars.length === 0
          ? `all ${pulsars.length} pulsars are settled`
          : `alerts held: ${morning.unlockedPulsars.join(', ')}`,
      link: '/pulsars',
      alert: morning.unlockedPulsars.length > 0,
    },
    {
      label: 'Quarantined',
      value: String(morning.quarantined.length),
      detail: morning.quarantined.length === 0 ? 'every row was usable' : 'rows or files, with reasons',
      link: '/feeds#quarantine',
      alert: morning.quarantined.length > 0,
    },
    {
      label: 'Mail waiting',
      value: String(morning.mail.waiting),
      detail: mailDetail(morning),
      link: '/mail',
      alert: morning.mail.waiting > 0 || morning.mail.refused > 0,
    },
  ];
  return html`<section class="glance" aria-label="The watch at a glance">${tiles.map(tile)}</section>`;
}

interface Tile {
  readonly label: string;
  readonly value: string;
  readonly detail: string;
  readonly link: string;
  readonly alert: boolean;
}

function tile(content: Tile): Html {
  return html`<a class="tile${content.alert ? ' attention' : ''}" href="${content.link}">
      <span class="label">${content.label}</span>
      <span class="value">${content.value}</span>
      <span class="detail">${visible(content.detail)}</span>
    </a>`;
}

function longestSilence(morning: MorningReview): string {
  const longest = [...morning.silentPulsars].sort((a, b) => b.daysSilent - a.daysSilent)[0];
  return longest === undefined
    ? 'every pulsar is being seen'
    : `longest: ${longest.pulsar}, ${span(longest.daysSilent * 24)}`;
}

function mailDetail({ mail }: MorningReview): string {
  const parts: string[] = [];
  if (mail.oldestWaitingHours !== null) parts.push(`oldest for ${span(mail.oldestWaitingHours)}`);
  if (mail.refused > 0) parts.push(`${mail.refused} refused`);
  return parts.length === 0 ? 'all delivered' : parts.join(', ');
}

function warnings(morning: MorningReview): Html {
  if (morning.warnings.length === 0) return html``;
  return html`<section class="caution" aria-label="Warnings">
    <ul>${morning.warnings.map((warning) => html`<li>${visible(warning)}</li>`)}</ul>
  </section>`;
}

const QUEUE: readonly Column<PulsarEvent>[] = [
  { head: 'Pulsar', cell: eventLink },
  { head: 'Explanation', cell: (event) => html`${eventName(event)} <small>${ownProbability(event)}</small>` },
  { head: 'Epoch', cell: (event) => epoch(event) },
  { head: 'Size', cell: size, whole: true },
  { head: 'ln Bayes factor', cell: (event) => plain(event.logBayesFactor, 3), numeric: true },
  { head: 'False alerts a year', cell: falseAlerts, numeric: true },
  { head: 'Arrivals', cell: (event) => String(event.arrivalsUsed), numeric: true },
];

const DECIDED: readonly Column<Decision>[] = [
  { head: 'Pulsar', cell: ({ event }) => eventLink(event) },
  { head: 'Decision', cell: decision },
  { head: 'Explanation', cell: ({ event }) => event.explanation },
  { head: 'Epoch', cell: ({ event }) => epoch(event) },
  { head: 'Size', cell: ({ event }) => size(event), whole: true },
  { head: 'When, UTC', cell: ({ at }) => utc(at), whole: true },
  {
    head: 'Note',
    cell: ({ verdict }) => (verdict === null ? ABSENT : html`<span class="note">${visible(verdict.note)}</span>`),
  },
];

function eventLink(event: PulsarEvent): Html {
  return html`<a class="event" href="${eventPath(event.id)}"><span class="mark ${event.state}" aria-hidden="true">${STATE_MARK[event.state]}</span><bdi>${subjectOf(event)}</bdi></a>`;
}

function epoch(event: PulsarEvent): Html {
  const [mjd, day] = mjdAndDay(event.epochMjd);
  return html`${mjd} <small>${day}</small>`;
}

function size(event: PulsarEvent): string {
  return sizeText(event) || ABSENT;
}

/** That noise alone would bring about at this level, in the whole programme. */
function falseAlerts({ falseAlertsPerYearAtThisLevel: rate }: PulsarEvent): string {
  return quantity({ value: rate, interval68: [rate, rate], unit: '', scale: 'power' });
}

function decision({ verdict }: Decision): Html | string {
  if (verdict === null) return 'withdrawn by later arrivals';
  return html`${VERDICT_PAST[verdict.verdict]} <small>by <bdi>${visible(verdict.by)}</bdi></small>`;
}

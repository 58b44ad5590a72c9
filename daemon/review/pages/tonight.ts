import { html } from 'hono/html';
import type { MorningReview } from '../../../alerts/morningReview.ts';
import { falseAlertLines } from '../../../alerts/wording/falseAlerts.ts';
import type { PulsarEvent } from '../../../detectors/steps/pulsarEvent.ts';
import type { Decision, PulsarOverview, WatchHealth } from '../desk.ts';
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
  readonly health: WatchHealth;
}

/** The first page: is anything waiting, is the watch well, what was decided lately. */
export function tonightPage(content: TonightContent): Html {
  const { morning } = content;
  return html`
    <h1 class="headline" data-fresh="headline">${headline(content)}</h1>
    <div data-fresh="glance">${glance(content)}
    ${warnings(morning)}</div>
    <section data-fresh="waiting" aria-labelledby="waiting">
      <h2 id="waiting">Waiting for a verdict</h2>
      <p class="lead">Most credible first. A candidate must be vetted before it is announced.</p>
      ${table({ caption: 'Waiting for a verdict', columns: QUEUE, rows: morning.waiting, empty: 'No candidate waits.' })}
    </section>
    <section data-fresh="suspected" aria-labelledby="suspected">
      <h2 id="suspected">Suspected</h2>
      <p class="lead">Not yet credible enough to call; the next arrivals decide.</p>
      ${table({ caption: 'Suspected', columns: QUEUE, rows: morning.suspected, empty: 'Nothing is suspected.' })}
    </section>
    <section data-fresh="decided" aria-labelledby="decided">
      <h2 id="decided">Recently decided</h2>
      ${table({
        caption: 'Recently decided',
        columns: DECIDED,
        rows: content.decisions,
        empty: 'Nothing has been decided yet.',
      })}
    </section>
    <section data-fresh="false-alerts" aria-labelledby="false-alerts">
      <h2 id="false-alerts">False alerts</h2>
      ${falseAlertLines(morning.falseAlerts).map((line) => html`<p class="lead">${line}</p>`)}
    </section>
    <p class="hint quiet">Keys: <kbd>j</kbd> next event, <kbd>k</kbd> previous, <kbd>Enter</kbd> opens it, <kbd>?</kbd> all keys.</p>`;
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

function glance(content: TonightContent): Html {
  const { morning, health, pulsars } = content;
  const silentFeeds = morning.silentFeeds.map((feed) => `${feed.feed}: ${span(feed.hoursSilent)}`);
  const tiles: Tile[] = [
    {
      label: 'The watch',
      value: health.ok ? 'well' : 'needs attention',
      detail: health.ok ? 'every part makes progress' : (health.problems[0] ?? ''),
      link: '/health',
      alert: !health.ok,
    },
    lastArrivalTile(content),
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
      link: '/pulsars?sort=last',
      alert: morning.silentPulsars.length > 0,
    },
    {
      label: 'Pulse count open',
      value: String(morning.unlockedPulsars.length),
      detail:
        morning.unlockedPulsars.length === 0
          ? `all ${pulsars.length} pulsars are settled`
          : `alerts held: ${someOf(morning.unlockedPulsars)}`,
      link: '/pulsars?state=count+open',
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
      alert: morning.mail.waiting > 0 || morning.mail.undelivered.length > 0,
    },
    falseAlertTile(morning),
  ];
  return html`<section class="glance" aria-label="The watch at a glance">${tiles.map(tile)}</section>`;
}

function lastArrivalTile({ morning, pulsars }: TonightContent): Tile {
  const last = Math.max(...pulsars.map(({ lastArrivalMjd }) => lastArrivalMjd ?? 0), 0);
  const { arrivals, files } = morning.intake;
  const lately = `${count(arrivals, 'arrival', 'arrivals')} in ${count(files, 'file', 'files')} since ${utc(morning.since)}`;
  const [mjd, day] = mjdAndDay(last);
  return {
    label: 'Last arrival',
    value: last === 0 ? 'none yet' : mjd,
    detail: last === 0 ? lately : `${day}; ${lately}`,
    link: '/feeds',
    alert: false,
  };
}

/** The operator's budget, and what came of the alerts so far. */
function falseAlertTile({ falseAlerts }: MorningReview): Tile {
  const { budgetPerYear, falseInLastYear, accepted, rejected, withdrawn } = falseAlerts;
  return {
    label: 'False in the last year',
    value: `${falseInLastYear} of ${plain(budgetPerYear, 2)} allowed`,
    detail: `ever: ${accepted} accepted, ${rejected} rejected, ${withdrawn} withdrawn`,
    link: '#false-alerts',
    alert: falseInLastYear > budgetPerYear,
  };
}

const MOST_NAMED = 3;

function someOf(names: readonly string[]): string {
  const more = names.length - MOST_NAMED;
  return `${names.slice(0, MOST_NAMED).join(', ')}${more > 0 ? ` and ${more} more` : ''}`;
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
  if (mail.undelivered.length > 0) parts.push(`${mail.undelivered.length} not delivered`);
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
  return html`<a class="event" href="${eventPath(event.id)}" data-says="${subjectOf(event)}, ${eventName(event)}"><span class="mark ${event.state}" aria-hidden="true">${STATE_MARK[event.state]}</span><bdi>${subjectOf(event)}</bdi></a>`;
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

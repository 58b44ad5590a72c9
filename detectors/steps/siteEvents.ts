/**
 * Evidence from other pulsars: a step in arrival time that several pulsars of a site show between the same nights, by the
 * same time, is one event of the site (common practice, no source), and what it explains is not reported of the pulsars.
 */

import type { Interval, PulsarEvent } from './pulsarEvent.ts';

const LEAST_PULSARS = 2;
/** Events this many days apart may be the same step, seen by pulsars with different schedules. */
const SLACK_DAYS = 0.5;
/** A suspicion is explained by a site event when a clock step holds at least this share of it. */
const LEAST_SHARE = 0.01;

/** All pulsars' own events → what is published: site events stand in place of the events they explain. */
export function combineSiteEvents(events: readonly PulsarEvent[]): readonly PulsarEvent[] {
  const steps = events.filter((e) => e.explanation === 'clock step' && isAlive(e) && e.timeStepUs !== null);
  const absorbed = new Set<PulsarEvent>();
  const published: PulsarEvent[] = [];
  for (const strongest of [...steps].sort((a, b) => b.logBayesFactor - a.logBayesFactor || (a.id < b.id ? -1 : 1))) {
    if (absorbed.has(strongest)) continue;
    const members = [strongest];
    let window = strongest.epochInterval95;
    for (const other of steps) {
      if (other === strongest || absorbed.has(other) || other.site !== strongest.site) continue;
      if (members.some((m) => m.pulsar === other.pulsar)) continue;
      const common = intersection(window, other.epochInterval95);
      if (common === null || !sameStep(strongest, other)) continue;
      members.push(other);
      window = common;
    }
    if (members.length < LEAST_PULSARS) continue;
    const explained = events.filter(
      (e) => !absorbed.has(e) && !members.includes(e) && isExplained(e, strongest, window),
    );
    for (const e of [...members, ...explained]) absorbed.add(e);
    published.push(siteEvent(members, window, explained));
  }
  // What is not joined stays the pulsar's own event.
  for (const event of events)
    if (!absorbed.has(event)) published.push(event.site === null ? event : { ...event, site: null });
  return published.sort((a, b) => a.epochMjd - b.epochMjd || (a.id < b.id ? -1 : 1));
}

function isAlive(event: PulsarEvent): boolean {
  return event.state === 'suspected' || event.state === 'confirmed';
}

/** A mere suspicion of the same nights that a clock step could also be, in a pulsar of which nothing else is confirmed. */
function isExplained(event: PulsarEvent, strongest: PulsarEvent, window: Interval): boolean {
  const share = event.explanations['clock step'] ?? 0;
  return (
    event.state === 'suspected' &&
    share > LEAST_SHARE &&
    (event.site === null || event.site === strongest.site) &&
    intersection(window, event.epochInterval95) !== null
  );
}

function intersection(a: Interval, b: Interval): Interval | null {
  const low = Math.max(a[0], b[0]);
  const high = Math.min(a[1], b[1]);
  return low <= high + SLACK_DAYS ? [Math.min(low, high), Math.max(low, high)] : null;
}

/** The same number of µs within three times the joint uncertainty. */
function sameStep(a: PulsarEvent, b: PulsarEvent): boolean {
  const half = (e: PulsarEvent) => (e.timeStepUsInterval68![1] - e.timeStepUsInterval68![0]) / 2;
  return Math.abs(a.timeStepUs! - b.timeStepUs!) < 3 * Math.hypot(half(a), half(b));
}

function siteEvent(members: readonly PulsarEvent[], window: Interval, explained: readonly PulsarEvent[]): PulsarEvent {
  const weights = members.map(
    (m) => 1 / Math.max(1e-12, (m.timeStepUsInterval68![1] - m.timeStepUsInterval68![0]) / 2) ** 2,
  );
  const total = weights.reduce((a, b) => a + b, 0);
  const step = members.reduce((sum, m, i) => sum + m.timeStepUs! * weights[i]!, 0) / total;
  const half = 1 / Math.sqrt(total);
  const confirmed = members.filter((m) => m.state === 'confirmed');
  const suspectedAt = members.map((m) => m.suspectedAtMjd).sort((a, b) => a - b);
  const confirmedAt = confirmed.map((m) => m.confirmedAtMjd!).sort((a, b) => a - b);
  // Two pulsars that agree on a suspicion confirm each other.
  const joint = confirmedAt[0] ?? suspectedAt[LEAST_PULSARS - 1]!;
  const [first] = members;
  const { site } = first!;
  return {
    ...first!,
    id: `site-${(site ?? 'unknown').replace(/[^A-Za-z0-9]+/g, '-')}-${Math.floor(window[0])}`,
    state: 'confirmed',
    epochMjd: (window[0] + window[1]) / 2,
    epochInterval68: window,
    epochInterval95: window,
    timeStepUs: step,
    timeStepUsInterval68: [step - half, step + half],
    firstArrivalMjd: Math.min(...members.map((m) => m.firstArrivalMjd)),
    suspectedAtMjd: suspectedAt[0]!,
    confirmedAtMjd: joint,
    arrivalsUsed: members.reduce((sum, m) => sum + m.arrivalsUsed, 0),
    logBayesFactor: members.reduce((sum, m) => sum + m.logBayesFactor, 0),
    falseAlertsPerYearAtThisLevel: Math.min(...members.map((m) => m.falseAlertsPerYearAtThisLevel)),
    pulsars: [...new Set([...members, ...explained].map((m) => m.pulsar))].sort(),
  };
}

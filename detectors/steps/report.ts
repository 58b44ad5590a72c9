/** Everything the detector says about one pulsar now. */

import { detectionLimit } from '../limits/detectionLimit.ts';
import type { PulsarReport } from '../report.ts';
import { mjdNumber } from '../time/mjd.ts';
import { contextOf, type EarlierGlitch } from './context.ts';
import { describe, describeBadSession } from './describe.ts';
import { measureForRecord } from './measure.ts';
import { pictureOf } from './picture.ts';
import type { EventPicture, PulsarEvent } from './pulsarEvent.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import { recentArrivals } from './recentArrivals.ts';
import { sessionShares } from './sessionShares.ts';
import { badSessions, verdictsOf } from './verdicts.ts';

export function report(watch: PulsarWatch): PulsarReport {
  const events: PulsarEvent[] = [];
  const glitches: EarlierGlitch[] = [];
  const pictures = new Map<string, EventPicture>();
  for (const track of watch.tracks) {
    if (track.partOf !== null) continue;
    const measured = measureForRecord(watch, track);
    const described = describe(watch, track, measured);
    const earlier = glitches.filter((g) => g.event.epochMjd < described.epochMjd);
    const event =
      track.kind === 'glitch' ? { ...described, context: contextOf(watch, track, described, earlier) } : described;
    events.push(event);
    if (track.kind === 'glitch' && track.state === 'confirmed') {
      glitches.push({ track, event, measurement: measured });
      glitches.sort((a, b) => a.event.epochMjd - b.event.epochMjd);
    }
    const picture = measured === null ? null : pictureOf(watch, event, track.bestGap, measured);
    if (picture !== null) pictures.set(event.id, picture);
  }
  const sessions = badSessions(watch);
  const shares = sessionShares(watch, sessions);
  sessions.forEach((session, i) => {
    events.push(describeBadSession(watch, session, shares[i]!));
  });
  events.sort((a, b) => a.epochMjd - b.epochMjd || (a.id < b.id ? -1 : 1));
  const last = watch.line.seen.at(-1);
  const arrivals = verdictsOf(watch);
  return {
    pulsar: watch.model.name,
    events,
    pictures,
    arrivals,
    noise: watch.noise,
    locked: watch.locked,
    lastArrivalMjd: last === undefined ? null : mjdNumber(last.arrival.tdb),
    limit: detectionLimit(watch),
    recent: recentArrivals(watch, arrivals),
  };
}

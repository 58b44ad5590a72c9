/** Everything the detector says about one pulsar now. */

import type { PulsarReport } from '../report.ts';
import { mjdNumber } from '../time/mjd.ts';
import { describe, describeBadSession } from './describe.ts';
import { measure } from './measure.ts';
import { pictureOf } from './picture.ts';
import type { EventPicture, PulsarEvent } from './pulsarEvent.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import { badSessions, verdictsOf } from './verdicts.ts';

export function report(watch: PulsarWatch): PulsarReport {
  const events: PulsarEvent[] = [];
  const pictures = new Map<string, EventPicture>();
  for (const track of watch.tracks) {
    const measured = measure(watch, track);
    const event = describe(watch, track, measured);
    events.push(event);
    const picture = measured === null ? null : pictureOf(watch, event, track.bestGap, measured);
    if (picture !== null) pictures.set(event.id, picture);
  }
  for (const session of badSessions(watch)) events.push(describeBadSession(watch, session));
  events.sort((a, b) => a.epochMjd - b.epochMjd || (a.id < b.id ? -1 : 1));
  const last = watch.line.seen.at(-1);
  return {
    pulsar: watch.model.name,
    events,
    pictures,
    arrivals: verdictsOf(watch),
    noise: watch.noise,
    locked: watch.locked,
    lastArrivalMjd: last === undefined ? null : mjdNumber(last.arrival.tdb),
  };
}

import type { TimedArrival } from '../../detectors/arrival.ts';
import {
  advance,
  type CurrentModel,
  currentModel,
  type PulsarEvent,
  report,
  startWatch,
} from '../../detectors/index.ts';
import type { PulsarModel } from '../../detectors/spin/pulsarModel.ts';
import { mjdNumber } from '../../detectors/time/mjd.ts';
import type { Station } from '../station.ts';
import { liveLog, modelInUse } from './deviation.ts';

/** The local spin-down model of a pulsar, from its log: as it stands, or as it was good at an earlier date. */

const NO_CHANGES = { arrivals: [], statusChanges: [], retimed: [] };
/** Arrivals so long after a date still belong to the model of that date, days. */
const AROUND_DAYS = 30;

export interface ModelOfDate {
  readonly current: CurrentModel;
  /** Events in it, oldest first. */
  readonly events: readonly PulsarEvent[];
}

/** Null: no arrivals to speak of (by that date). */
export function modelOfDate(station: Station, model: PulsarModel, atMjd: number | null): ModelOfDate | null {
  const log = liveLog(station, model.name, NO_CHANGES);
  const now = followed(station, model, log);
  if (atMjd === null || now === null) return now;
  const cut = log.slice(0, arrivalsAround(log, now.events, atMjd));
  return followed(station, model, cut);
}

function followed(station: Station, model: PulsarModel, log: readonly TimedArrival[]): ModelOfDate | null {
  const watch = startWatch(modelInUse(station, model.name), station.settingsOf(model));
  for (const arrival of log) advance(watch, arrival);
  const reported = report(watch).events;
  const current = currentModel(watch, reported);
  if (current === null) return null;
  return { current, events: reported.filter(({ id }) => current.events.includes(id)) };
}

/**
 * How many arrivals make the model of a date: those until a month after it, and as many more as confirmed the glitch before it, but
 * none from after the next glitch.
 */
function arrivalsAround(log: readonly TimedArrival[], glitches: readonly PulsarEvent[], atMjd: number): number {
  const before = glitches.findLast(({ epochMjd }) => epochMjd <= atMjd);
  const next = glitches.find(({ epochMjd }) => epochMjd > atMjd);
  const until = Math.max(atMjd + AROUND_DAYS, before?.confirmedAtMjd ?? 0);
  const count = log.findIndex(({ tdb }) => {
    const mjd = mjdNumber(tdb);
    return mjd > until || (next !== undefined && mjd >= next.firstArrivalMjd);
  });
  return count < 0 ? log.length : count;
}

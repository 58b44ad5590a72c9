/** The record of a new suspicion. */

import { mjdNumber } from '../time/mjd.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import type { Track } from './track.ts';

export function newTrack(watch: PulsarWatch, index: number): Track {
  const day = Math.floor(mjdNumber(watch.line.seen[index]!.arrival.tdb));
  const stem = `${watch.model.name.replace(/\s+/g, '')}-${day}`;
  const same = watch.tracks.filter((t) => t.id === stem || t.id.startsWith(`${stem}.`)).length;
  const track: Track = {
    number: watch.tracks.length,
    id: same === 0 ? stem : `${stem}.${same + 1}`,
    kind: 'glitch',
    state: 'suspected',
    bestGap: index,
    firstGap: index,
    lastGap: index,
    logPlaces: 0,
    suspectedAt: index,
    confirmedAt: null,
    rateStep: 0,
    askAgainAt: 0,
    logOdds: 0,
    explanations: {},
    shapes: null,
    modes: null,
    partOf: null,
    settled: false,
  };
  watch.tracks.push(track);
  return track;
}

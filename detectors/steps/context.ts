/** What a glitch stands beside: the pulsar's age, its earlier glitches, the stretch before this one, the class. */

import { secondDerivative } from '../recovery/interGlitch.ts';
import { mjdNumber } from '../time/mjd.ts';
import { countedArrivals } from './counts.ts';
import type { Measurement } from './measure.ts';
import type { EventContext, PulsarEvent } from './pulsarEvent.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import type { Track } from './track.ts';

const SECONDS_PER_YEAR = 365.25 * 86_400;
const LARGE_HZ = 1e-5;
const MILLISECOND_HZ = 50;
const MILLISECOND_DERIVATIVE = 1e-13;
/** An index whose 68 % interval is wider than its own size says nothing. */
const LEAST_SIGNIFICANCE = 2;

/** `earlier`: the events of the pulsar on record before this one, with their measurements, oldest first. */
export interface EarlierGlitch {
  readonly track: Track;
  readonly event: PulsarEvent;
  readonly measurement: Measurement | null;
}

export function contextOf(
  watch: PulsarWatch,
  track: Track,
  event: PulsarEvent,
  earlier: readonly EarlierGlitch[],
): EventContext {
  const { frequencyHz, frequencyDerivativeHzPerS } = watch.model.spin;
  const nu = frequencyHz.hi;
  const known = watch.model.glitches.map(({ epochTdb, frequencyStepHz, recoveries }) => ({
    epochMjd: mjdNumber(epochTdb),
    deltaNuOverNu: recoveries.reduce((sum, r) => sum + r.frequencyStepHz, frequencyStepHz) / nu,
  }));
  const own = [
    ...known.filter(({ epochMjd }) => epochMjd < event.epochMjd),
    ...earlier.flatMap(({ event: { epochMjd, deltaNuOverNu } }) =>
      deltaNuOverNu === null ? [] : [{ epochMjd, deltaNuOverNu }],
    ),
  ].sort((a, b) => a.epochMjd - b.epochMjd);
  const last = own.at(-1);
  return {
    characteristicAgeYears:
      frequencyDerivativeHzPerS < 0 ? -nu / (2 * frequencyDerivativeHzPerS) / SECONDS_PER_YEAR : null,
    waitedDays: last === undefined ? null : event.epochMjd - last.epochMjd,
    earlierGlitches: own,
    brakingIndex: brakingIndex(watch, track, earlier.at(-1)),
    typical: typicalOf(event, nu, frequencyDerivativeHzPerS),
  };
}

/** n = ν ν̈/ν̇² between the glitch before and this one; null where noise hides it. */
function brakingIndex(
  watch: PulsarWatch,
  track: Track,
  before: EarlierGlitch | undefined,
): EventContext['brakingIndex'] {
  const { frequencyHz, frequencyDerivativeHzPerS, frequencySecondDerivativeHzPerS2 } = watch.model.spin;
  if (before === undefined || frequencyDerivativeHzPerS === 0) return null;
  const arrivals = countedArrivals(watch, watch.bank!.beam[0]!).slice(before.track.bestGap, track.bestGap);
  const running = before.measurement?.glitch?.recovery?.terms.map((t) => t.timescaleDays.median) ?? [];
  const found = secondDerivative(arrivals, watch.noise, running);
  if (found === null) return null;
  const perUnit = frequencyHz.hi / frequencyDerivativeHzPerS ** 2;
  const value = perUnit * (frequencySecondDerivativeHzPerS2 + found.mean);
  const sd = perUnit * found.sd;
  if (!(Math.abs(value) > LEAST_SIGNIFICANCE * sd)) return null;
  return { value, interval68: [value - sd, value + sd], fromMjd: before.event.epochMjd };
}

/** Published statements that bear on this event, no conclusions. */
function typicalOf(event: PulsarEvent, nu: number, nuDot: number): EventContext['typical'] {
  const found: { text: string; source: string }[] = [];
  const size = event.deltaNuHz ?? 0;
  if (size < 0) {
    found.push({
      text: 'Steps of negative sign are known from magnetars and, once, from a rotation-powered pulsar.',
      source: 'Tuo et al. 2024, arXiv:2404.18158',
    });
    return found;
  }
  found.push(
    size > LARGE_HZ
      ? {
          text: 'Large glitches crowd in a sharp peak near 20 µHz.',
          source: 'Fuentes et al. 2017, A&A 608, A131',
        }
      : {
          text: 'Published sizes lie between 1e-10 and 1e-5 of ν, with peaks near 1e-9 and 1e-6.',
          source: 'Yu et al. 2013, MNRAS 429, 688',
        },
  );
  if (nu > MILLISECOND_HZ && Math.abs(nuDot) < MILLISECOND_DERIVATIVE)
    found.push({
      text: 'Glitches of millisecond pulsars are rare: two such pulsars were known to have glitched in 2016.',
      source: 'McKee et al. 2016, MNRAS 461, 2809',
    });
  else
    found.push({
      text: 'Glitch activity is highest at characteristic ages near 10 kyr and low below 1 kyr; none was seen above 20 Myr.',
      source: 'Espinoza et al. 2011, MNRAS 414, 1679',
    });
  if (event.recovery.terms.some(({ kind }) => kind === 'recovery'))
    found.push({
      text: 'After large glitches exponential recoveries of 100 to 1000 days are common; some glitches show none.',
      source: 'Yuan et al. 2010, MNRAS 404, 289',
    });
  return found;
}

import type { TimedArrival } from '../arrival.ts';
import { mjdNumber } from '../time/mjd.ts';

/** A step of a site's clock, or of one receiver's, as the arrivals of its pulsars show it. */
export interface SiteStep {
  readonly site: string;
  /** Null: all receivers of the site. */
  readonly receiver: string | null;
  /** The last arrival before and the first after it, MJD as the site's clock reads. */
  readonly afterMjd: number;
  readonly beforeMjd: number;
  /** Positive: what is recorded after it is late. */
  readonly stepUs: number;
  readonly uncertaintyUs: number;
}

type Place = Pick<TimedArrival, 'site' | 'receiver' | 'siteMjd' | 'tdb'>;

/** When the site took the arrival, MJD; arrivals that came at the barycentre have no other time than that. */
export function siteMjdOf({ siteMjd, tdb }: Pick<Place, 'siteMjd' | 'tdb'>): number {
  return siteMjd ?? mjdNumber(tdb);
}

/** The name of a group of arrivals, `site|receiver`, taken apart. */
export function placeNamed(name: string): { readonly site: string; readonly receiver: string } {
  const bar = name.indexOf('|');
  return { site: name.slice(0, bar), receiver: name.slice(bar + 1) };
}

export function isOfClock(
  { site, receiver }: Pick<SiteStep, 'site' | 'receiver'>,
  place: Pick<Place, 'site' | 'receiver'>,
): boolean {
  return site === place.site && (receiver === null || receiver === place.receiver);
}

export function isFelt(step: SiteStep, arrival: Place): boolean {
  return isOfClock(step, arrival) && isAfter(step, siteMjdOf(arrival));
}

export function isAfter({ afterMjd, beforeMjd }: SiteStep, siteMjd: number): boolean {
  return siteMjd > (afterMjd + beforeMjd) / 2;
}

/** By how much the arrival was recorded late because of the steps before it, µs. */
export function lateByUs(steps: readonly SiteStep[], arrival: Place): number {
  return steps.reduce((sum, step) => (isFelt(step, arrival) ? sum + step.stepUs : sum), 0);
}

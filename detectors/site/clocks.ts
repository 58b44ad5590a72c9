/** Which clocks a site has, and which pulsars show each: one of the whole site, and one of every receiver where there are several. */

import { EvidenceLog } from './evidenceLog.ts';
import type { PulsarTimes } from './pulsarTimes.ts';
import { isOfClock, placeNamed, type SiteStep } from './siteStep.ts';

export type ClockName = Pick<SiteStep, 'site' | 'receiver'>;

export interface Member {
  readonly pulsar: string;
  readonly log: EvidenceLog;
}

export interface Clock {
  readonly name: ClockName;
  readonly members: readonly Member[];
}

export function clocksOf(pulsars: readonly PulsarTimes[]): Clock[] {
  const places = [...new Set(pulsars.flatMap((times) => times.places))].sort().map(placeNamed);
  const sites = [...new Set(places.map(({ site }) => site))];
  return sites.flatMap((site) => {
    const receivers = places.filter((place) => place.site === site).map(({ receiver }) => receiver);
    const own = receivers.length < 2 ? [] : receivers;
    return [null, ...own].map((receiver) => clockOf({ site, receiver }, pulsars));
  });
}

function clockOf(name: ClockName, pulsars: readonly PulsarTimes[]): Clock {
  const members = pulsars.flatMap(({ pulsar, places }) => {
    const isMember = places.map((place) => isOfClock(name, placeNamed(place)));
    return isMember.includes(true) ? [{ pulsar, log: new EvidenceLog(isMember) }] : [];
  });
  return { name, members };
}

export function clockName({ site, receiver }: ClockName): string {
  return receiver === null ? site : `${site}|${receiver}`;
}

export function byName(a: ClockName, b: ClockName): number {
  return clockName(a) < clockName(b) ? -1 : 1;
}

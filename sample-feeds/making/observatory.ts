/** Kestrel Ridge: an invented observatory. Its place is open sea (36.2° N, 20.1° W), so that nobody's telescope is meant. */

export const SITES = {
  'kestrel ridge': { itrfM: [4839474.7, -1771053.71, 3746609.35], clockTable: 'clock/kestrel-ridge.csv' },
  'kestrel annex': { itrfM: [4845672.23, -1757668.08, 3744822.07], clockTable: 'clock/kestrel-annex.csv' },
} as const;
export type SiteName = keyof typeof SITES;

/** Degrees east, for planning only: when a pulsar stands highest. */
export const LONGITUDE_DEG = -20.1;

export const FEEDS = ['main', 'annex', 'monitor'] as const;
export type FeedName = (typeof FEEDS)[number];

export interface Receiver {
  readonly name: string;
  readonly feed: string;
  /** `barycentre`: whoever runs it delivers times that are there already, in TDB. */
  readonly site: SiteName | 'barycentre';
  /** Infinity where there is no dispersion. */
  readonly frequencyMhz: number;
  /** Delay of its cables and electronics: constant, and known to nobody at the observatory. */
  readonly delayUs: number;
}

export const RECEIVERS = {
  ridge700: { name: 'ridge-700', feed: 'main', site: 'kestrel ridge', frequencyMhz: 704.5, delayUs: 3.1 },
  ridge1400: { name: 'ridge-1400', feed: 'main', site: 'kestrel ridge', frequencyMhz: 1396.0, delayUs: 1.2 },
  annex1400: { name: 'annex-1400', feed: 'annex', site: 'kestrel annex', frequencyMhz: 1412.25, delayUs: 8.4 },
  monitor600: { name: 'monitor-600', feed: 'monitor', site: 'kestrel ridge', frequencyMhz: 612.0, delayUs: 21.7 },
} as const satisfies Record<string, Receiver>;

/** A night is a UTC day; the feeds hold one file a night. */
export const FIRST_NIGHT_MJD = 60_600;
export const NIGHTS = 400;
export const LAST_NIGHT_MJD = FIRST_NIGHT_MJD + NIGHTS - 1;

/** Start models were fitted to this many days before the first night. */
export const MODEL_SPAN_DAYS = 60;

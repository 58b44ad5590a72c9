import type { FeedName, SiteName } from './observatory.ts';

/** Everything that was planted, and the only place where it stands: feeds and expected answers are both made from it. */

export interface Glitch {
  readonly pulsar: string;
  /** TDB at the barycentre. */
  readonly epochMjd: number;
  /** The whole step at the epoch, recovering part included. */
  readonly deltaNuOverNu: number;
  readonly deltaNuDotOverNuDot: number;
  readonly recoveries: readonly { readonly fraction: number; readonly timescaleDays: number }[];
}

export const LARGE_GLITCH: Glitch = {
  pulsar: 'KR 0834-21',
  epochMjd: 60_978.37,
  deltaNuOverNu: 1.62e-6,
  deltaNuDotOverNuDot: 7.4e-3,
  recoveries: [{ fraction: 0.018, timescaleDays: 7.5 }],
};

/** Too small to be seen the night after: it grows out of the noise. */
export const SMALL_GLITCH: Glitch = {
  pulsar: 'KR 0529+22',
  epochMjd: 60_981.61,
  deltaNuOverNu: 3.1e-9,
  deltaNuDotOverNuDot: 0,
  recoveries: [],
};

export const GLITCHES: readonly Glitch[] = [LARGE_GLITCH, SMALL_GLITCH];

/** Young and restless: it must not be taken for a glitching one. */
export const NOISY_PULSAR = 'KR 2014+36';

/** From this site date on the clock reads late, and no clock table says so. */
export const CLOCK_STEP = { site: 'kestrel annex' as SiteName, fromMjdUtc: 60_987.5, stepUs: 180 };

/** pc cm⁻³ */
export const DISPERSION_STEP = { pulsar: 'KR 1309-12', fromMjd: 60_984.2, step: 0.021 };

/** The fold was started with a wrong setting for one pulsar: that night's arrivals are all late, those before and after are not. */
export const BAD_SESSION = { pulsar: 'KR 0417+31', feed: 'main' as FeedName, nightMjd: 60_990, shiftUs: 1900 };

/** The last file that came. */
export const SILENT_FEED = { feed: 'monitor' as FeedName, lastNightMjd: 60_986 };

/** Rows of a hand-edited file, each with what the complaint must name. `line` counts the header as 1. */
export const BROKEN_ROWS = {
  feed: 'main' as FeedName,
  nightMjd: 60_993,
  rows: [
    { line: 3, text: 'KR 0529+22,6O993.2217403361185,204.10,1396.000,kestrel ridge,ridge-1400', reason: 'mjd_utc' },
    {
      line: 5,
      text: 'KR 0834-21,60993.3514420087316,-88.40,1396.000,kestrel ridge,ridge-1400',
      reason: 'uncertainty_us',
    },
    {
      line: 6,
      text: 'KR 1309-12,60993.5340028816402,31.75,1396.000,kestrel rigde,ridge-1400',
      reason: 'kestrel rigde',
    },
    { line: 8, text: 'KR 0731-44,60993.3107741920583,120.00,1396.000,kestrel ridge,ridge-1400', reason: 'KR 0731-44' },
    { line: 9, text: 'KR 2014+36,60993.8274', reason: 'fields' },
  ],
} as const;

/** A disk filled up while the recorder wrote: nothing but zero bytes. */
export const BROKEN_FILE = { feed: 'annex' as FeedName, nightMjd: 60_985, bytes: 512 };

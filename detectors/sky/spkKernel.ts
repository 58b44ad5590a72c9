import { type Mjd, SECONDS_PER_DAY } from '../time/mjd.ts';
import { chebyshevSeries } from './chebyshevTable.ts';
import { J2000_MJD } from './constants.ts';
import type { EarthAndSun } from './earthSunTable.ts';
import { sum, type Vector } from './vector.ts';

/** Numbers that the SPK format gives the bodies (NAIF, *NAIF Integer ID codes*). */
export const BODY = { barycentre: 0, earthMoonBarycentre: 3, sun: 10, earth: 399 } as const;

/** Earth and Sun from an SPK kernel (read by `readSpkKernel`), so that a model is used with the ephemeris it was fitted with. */
export interface SpkKernel {
  /** The file, for messages. */
  readonly name: string;
  /** In the order of the file: where two cover a date, the later one holds (NAIF, *SPK Required Reading*). */
  readonly segments: readonly SpkSegment[];
}

/** A run of equal intervals, each with one Chebyshev series a component; ICRF, km and km/s, TDB seconds from J2000. */
export interface SpkSegment {
  readonly target: number;
  readonly centre: number;
  readonly startS: number;
  readonly endS: number;
  /** Type 2 holds positions, type 3 positions and velocities. */
  readonly type: 2 | 3;
  readonly firstIntervalS: number;
  readonly intervalS: number;
  readonly intervals: number;
  readonly terms: number;
  /** Interval by interval, within it component by component, lowest order first. */
  readonly coefficients: Float64Array;
}

/** Earth and Sun against the solar-system barycentre; a sentence where the kernel does not cover the date (TDB). */
export function earthAndSunFromKernel(kernel: SpkKernel, tdb: Mjd): EarthAndSun | { readonly reason: string } {
  const earth = fromBarycentre(kernel, BODY.earth, tdb);
  const sun = fromBarycentre(kernel, BODY.sun, tdb);
  if (earth === null || sun === null) return { reason: outside(kernel, earth === null ? BODY.earth : BODY.sun, tdb) };
  return { earthKm: earth.km, earthKmPerS: earth.kmPerS, sunKm: sun.km };
}

interface Motion {
  readonly km: Vector;
  readonly kmPerS: Vector;
}

/** More centres than this one after the other is a ring. */
const LONGEST_CHAIN = 5;

/** The body's motion, added up from centre to centre until the barycentre is reached. */
function fromBarycentre({ segments }: SpkKernel, body: number, tdb: Mjd): Motion | null {
  let at: Motion | null = null;
  for (let target = body, links = 0; target !== BODY.barycentre; links++) {
    const segment = links < LONGEST_CHAIN ? segmentOf(segments, target, tdb) : null;
    if (segment === null) return null;
    const link = motionIn(segment, tdb);
    at = at === null ? link : { km: sum(at.km, link.km), kmPerS: sum(at.kmPerS, link.kmPerS) };
    target = segment.centre;
  }
  return at;
}

function segmentOf(segments: readonly SpkSegment[], target: number, tdb: Mjd): SpkSegment | null {
  const seconds = secondsSince(0, tdb);
  for (let i = segments.length - 1; i >= 0; i--) {
    const segment = segments[i]!;
    if (segment.target === target && seconds >= segment.startS && seconds <= segment.endS) return segment;
  }
  return null;
}

/** The whole day is taken first, so that the date keeps its last digits: the sum alone would hold 0.1 µs. */
function secondsSince(startS: number, tdb: Mjd): number {
  return (tdb.day - J2000_MJD) * SECONDS_PER_DAY - startS + tdb.fraction * SECONDS_PER_DAY;
}

function motionIn(segment: SpkSegment, tdb: Mjd): Motion {
  const { intervalS, terms, coefficients, type } = segment;
  const since = secondsSince(segment.firstIntervalS, tdb);
  const interval = Math.min(segment.intervals - 1, Math.max(0, Math.floor(since / intervalS)));
  const x = (2 * (since - interval * intervalS)) / intervalS - 1;
  const first = interval * (type === 2 ? 3 : 6) * terms;
  const px = chebyshevSeries(coefficients, first, terms, x);
  const py = chebyshevSeries(coefficients, first + terms, terms, x);
  const pz = chebyshevSeries(coefficients, first + 2 * terms, terms, x);
  const perS = 2 / intervalS;
  const kmPerS: Vector =
    type === 2
      ? [px.slope * perS, py.slope * perS, pz.slope * perS]
      : [
          chebyshevSeries(coefficients, first + 3 * terms, terms, x).value,
          chebyshevSeries(coefficients, first + 4 * terms, terms, x).value,
          chebyshevSeries(coefficients, first + 5 * terms, terms, x).value,
        ];
  return { km: [px.value, py.value, pz.value], kmPerS };
}

function outside({ name, segments }: SpkKernel, body: number, tdb: Mjd): string {
  const what = body === BODY.earth ? 'the Earth' : 'the Sun';
  const links = segments.filter(({ target }) => (body === BODY.earth ? target !== BODY.sun : target === BODY.sun));
  const spans = links.map(
    ({ target, startS, endS }) => `body ${target} from MJD ${toMjd(startS).toFixed(1)} to ${toMjd(endS).toFixed(1)}`,
  );
  return `MJD ${tdb.day} is outside what the kernel ${name} holds for ${what} (${spans.join(', ')})`;
}

function toMjd(secondsFromJ2000: number): number {
  return J2000_MJD + secondsFromJ2000 / SECONDS_PER_DAY;
}

/** Time from outside, behind one face so that tests can set it. Nothing else in `daemon/` reads the clock. */
export interface Clock {
  /** Wall time: for records and for civil dates. May step. */
  now(): Date;
  /** Milliseconds that only grow: for intervals. */
  monotonicMs(): number;
}

export const systemClock: Clock = {
  now: () => new Date(),
  monotonicMs: () => performance.now(),
};

/** A date and time of day as a wall clock in some zone shows it. */
export interface CivilTime {
  /** `2026-03-29` */
  readonly date: string;
  /** `08:00:00` */
  readonly time: string;
}

const formats = new Map<string, Intl.DateTimeFormat>();

/** What a wall clock in the IANA zone `zone` shows at an instant. Throws RangeError for an unknown zone. */
export function civilTime(at: Date, zone: string): CivilTime {
  let format = formats.get(zone);
  if (format === undefined) {
    // en-CA with h23 is fixed here so that no locale of the host changes the digits.
    format = new Intl.DateTimeFormat('en-CA', {
      timeZone: zone,
      calendar: 'gregory',
      numberingSystem: 'latn',
      hourCycle: 'h23',
      year: 'numeric',
      month: '2-digit',
      day: '2-digit',
      hour: '2-digit',
      minute: '2-digit',
      second: '2-digit',
    });
    formats.set(zone, format);
  }
  const parts = new Map(format.formatToParts(at).map((part) => [part.type, part.value]));
  const part = (type: Intl.DateTimeFormatPartTypes) => parts.get(type) ?? '';
  return {
    date: `${part('year').padStart(4, '0')}-${part('month')}-${part('day')}`,
    time: `${part('hour')}:${part('minute')}:${part('second')}`,
  };
}

/** The first instant at which a wall clock in `zone` shows `date` and at least `time`: inside a gap of daylight saving, its end. */
export function instantOf({ date, time }: CivilTime, zone: string): Date {
  const wanted = `${date} ${time}`;
  const shows = (ms: number) => {
    const wall = civilTime(new Date(ms), zone);
    return `${wall.date} ${wall.time}` >= wanted;
  };
  // Offsets of zones lie within a day of UTC. What a wall clock shows can fall back, so the search is by steps, then halves.
  const around = Date.parse(`${date}T${time}Z`);
  let late = around - MS_PER_DAY;
  while (!shows(late)) late += MS_PER_QUARTER_HOUR;
  let early = late - MS_PER_QUARTER_HOUR;
  while (late - early > 1000) {
    const middle = Math.floor((early + late) / 2000) * 1000;
    if (shows(middle)) late = middle;
    else early = middle;
  }
  return new Date(late);
}

const MS_PER_QUARTER_HOUR = 900_000;
const UNIX_EPOCH_MJD = 40_587;
const MS_PER_DAY = 86_400_000;

/** UTC as a Modified Julian Date, good to a millisecond. */
export function mjdOf(at: Date): number {
  return UNIX_EPOCH_MJD + at.getTime() / MS_PER_DAY;
}

export function instantOfMjd(mjd: number): Date {
  return new Date((mjd - UNIX_EPOCH_MJD) * MS_PER_DAY);
}

/**
 * Sees a wall clock that was set: compares how far it went with how far the monotonic clock went since the last call.
 * Returns the step in seconds when it is larger than `toleranceS`, else null.
 */
export function clockStepWatch(clock: Clock, toleranceS = 60): () => number | null {
  let lastWall = clock.now().getTime();
  let lastMonotonic = clock.monotonicMs();
  return () => {
    const wall = clock.now().getTime();
    const monotonic = clock.monotonicMs();
    const stepS = (wall - lastWall - (monotonic - lastMonotonic)) / 1000;
    lastWall = wall;
    lastMonotonic = monotonic;
    return Math.abs(stepS) > toleranceS ? stepS : null;
  };
}

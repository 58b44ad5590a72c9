import { createHash } from 'node:crypto';
import type { ReceivedArrival } from '../../detectors/arrival.ts';
import { daysBetween, SECONDS_PER_DAY } from '../../detectors/time/mjd.ts';

/**
 * When two rows are the same arrival. By content: all values equal, whichever file they stand in and however the digits are
 * written; such rows have one key. By measurement: same pulsar, site, receiver, frequency and time scale, and times within 1 µs;
 * such rows are values of one arrival, of which one counts.
 */
export function arrivalKey(arrival: ReceivedArrival): string {
  const content = [
    ...measurementParts(arrival),
    arrival.time.day,
    arrival.time.fraction,
    arrival.uncertaintyUs,
    arrival.pulseNumber,
    arrival.signalToNoise,
    arrival.note,
  ];
  return createHash('sha256').update(JSON.stringify(content)).digest('hex').slice(0, 32);
}

/** All that makes a measurement but its time. */
export function measurementOf(arrival: ReceivedArrival): string {
  return JSON.stringify(measurementParts(arrival));
}

function measurementParts({ pulsar, site, receiver, frequencyMhz, timeScale }: ReceivedArrival) {
  // JSON has no infinity: 0 stands for dispersion removed, which no measured frequency is.
  return [pulsar, site, receiver, Number.isFinite(frequencyMhz) ? frequencyMhz : 0, timeScale];
}

/** 1 µs, and the rounding of a day's fraction in a double. */
const SAME_TIME_US = 1 + 1e-4;

export function isSameTime(a: ReceivedArrival, b: ReceivedArrival): boolean {
  return Math.abs(daysBetween(a.time, b.time)) * SECONDS_PER_DAY * 1e6 <= SAME_TIME_US;
}

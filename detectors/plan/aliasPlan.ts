/**
 * Sizes that the arrivals so far cannot tell apart, and the next observations that can. Two sizes drift apart in phase by
 * their difference times the time since the last arrival; whether that shows depends on how sure the phase is by then. Two
 * arrivals in one night measure the rate without help from the prediction.
 */

import type { PulsarEvent } from '../steps/pulsarEvent.ts';
import type { PulsarWatch } from '../steps/pulsarWatch.ts';
import { lastMjd, nextUsualTime, nullAhead, SIDEREAL_DAY, usualVariance } from './ahead.ts';

export interface AliasPlan {
  readonly event: string;
  readonly aliases: PulsarEvent['aliases'];
  /** Probability of the likeliest size today. */
  readonly probabilityNow: number;
  /** The most telling first. */
  readonly options: readonly AliasOption[];
}

export interface AliasOption {
  /** One observation, or two in one night. */
  readonly timesMjd: readonly number[];
  /** Hours from the usual sidereal time, by observation. */
  readonly hoursFromUsual: readonly number[];
  /** Expected probability of the size that will then be likeliest. */
  readonly expectedProbability: number;
  /** How far each other size lies from the likeliest in what would be measured: turns, and in its σ. */
  readonly separations: readonly { readonly deltaNuHz: number; readonly turns: number; readonly sigmas: number }[];
}

const SECONDS_PER_DAY = 86_400;
const NIGHTS = 5;
/** A source is up for some hours on either side of its usual time (common practice, no source). */
const HOURS = [-4, -3, -2, -1.5, -1, -0.5, 0, 0.5, 1, 1.5, 2, 3, 4];
const MOST_OPTIONS = 6;

export function planForAliases(watch: PulsarWatch, event: PulsarEvent, asOfMjd: number): AliasPlan {
  const aliases = [...event.aliases].sort((a, b) => b.probability - a.probability);
  const usual = nextUsualTime(watch, asOfMjd + Math.max(...HOURS) / 24);
  const options: AliasOption[] = [];
  for (let night = 0; night < NIGHTS; night++) {
    const middle = usual + night * SIDEREAL_DAY;
    for (const [i, first] of HOURS.entries()) {
      options.push(option(watch, aliases, middle, [first]));
      for (const second of HOURS.slice(i + 1)) options.push(option(watch, aliases, middle, [first, second]));
    }
  }
  return {
    event: event.id,
    aliases,
    probabilityNow: aliases[0]!.probability,
    options: worthListing(options),
  };
}

/** The best single and the best pair of each night, the most telling first; the earlier where two are as good. */
function worthListing(options: readonly AliasOption[]): AliasOption[] {
  const night = (o: AliasOption) => Math.round((o.timesMjd[0]! - o.hoursFromUsual[0]! / 24) / SIDEREAL_DAY);
  const best = new Map<string, AliasOption>();
  for (const o of options) {
    const key = `${night(o)} ${o.timesMjd.length}`;
    const before = best.get(key);
    if (before === undefined || o.expectedProbability > before.expectedProbability + 1e-3) best.set(key, o);
  }
  return [...best.values()]
    .sort((a, b) => rounded(b) - rounded(a) || a.timesMjd.at(-1)! - b.timesMjd.at(-1)!)
    .slice(0, MOST_OPTIONS);
}

function rounded({ expectedProbability }: AliasOption): number {
  return Math.round(expectedProbability * 100);
}

function option(
  watch: PulsarWatch,
  aliases: PulsarEvent['aliases'],
  usualMjd: number,
  hours: readonly number[],
): AliasOption {
  const timesMjd = hours.map((h) => usualMjd + h / 24);
  const [first, second] = timesMjd as [number, number | undefined];
  const since = first - lastMjd(watch);
  const ahead = nullAhead(watch, since);
  const arrival = usualVariance(watch);
  const size = ahead.mean.length;
  // One arrival is held against the prediction; of two, the second against the first.
  const apart = second === undefined ? since : second - first;
  const variance = second === undefined ? ahead.cov[0]! + arrival : ahead.cov[size + 1]! * apart ** 2 + 2 * arrival;
  const sigma = Math.sqrt(variance);
  const turns = aliases.map((a) => wrapped((a.deltaNuHz - aliases[0]!.deltaNuHz) * apart * SECONDS_PER_DAY));
  const single = second === undefined ? 0 : option(watch, aliases, usualMjd, [hours[0]!]).expectedProbability;
  const own = expectedLargest(
    aliases.map((a) => a.probability),
    turns,
    sigma,
  );
  return {
    timesMjd,
    hoursFromUsual: hours,
    expectedProbability: Math.max(single, own),
    separations: aliases
      .slice(1)
      .map((a, i) => ({ deltaNuHz: a.deltaNuHz, turns: turns[i + 1]!, sigmas: Math.abs(turns[i + 1]!) / sigma })),
  };
}

function wrapped(turns: number): number {
  return turns - Math.round(turns);
}

const GRID = 400;

/** ∫ max_j p_j f_j over a turn, with f_j normal about each expected phase: the chance that the likeliest will be the true one. */
export function expectedLargest(probabilities: readonly number[], turns: readonly number[], sigma: number): number {
  const total = probabilities.reduce((a, b) => a + b, 0);
  const width = Math.max(sigma, 2 / GRID);
  let sum = 0;
  for (let k = 0; k < GRID; k++) {
    let largest = 0;
    probabilities.forEach((p, j) => {
      let density = 0;
      for (let turn = -2; turn <= 2; turn++) density += Math.exp(-0.5 * ((k / GRID - turns[j]! + turn) / width) ** 2);
      largest = Math.max(largest, (p / total) * density);
    });
    sum += largest;
  }
  const normal = sum / (GRID * width * Math.sqrt(2 * Math.PI));
  return Math.min(1, Math.max(normal, Math.max(...probabilities) / total));
}

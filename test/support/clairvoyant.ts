/**
 * The test that no detector can beat: it knows the size and sign of the step, the noise, and what the step does to each
 * innovation; only the time of the step and the spin before it are unknown to it. Page 1954 (Biometrika 41, 100); smallest
 * worst-case mean delay at a given rate of false alarms: Lorden 1971 (Ann. Math. Statist. 42, 1897), Moustakides 1986
 * (Ann. Statist. 14, 1379). A step's mark on the innovations grows with time, so each possible epoch has a sum of its own
 * (Willsky & Jones 1976), and the largest decides. Dense matrices of its own: it shares no code with the detector.
 */
import type { Walks } from '../../detectors/filter/stateSpace.ts';
import type { Dice } from './simulatedPulsar.ts';

/** Where in a gap the step may be: thirds are fine enough. */
const PLACES_IN_GAP = [1 / 6, 1 / 2, 5 / 6];
const SECONDS_PER_DAY = 86_400;
/** σ of the start model's rate (turns/day) and its derivative (turns/day²): far more than a hundred arrivals leave open. */
const START_ERRORS = [1e-2, 3e-5];

/** Everything about the programme that the innovations' law depends on. */
export interface KnownPulsar {
  readonly days: readonly number[];
  readonly walks: Walks;
  readonly sigmaTurns: number;
}

/** The filter's gains and innovation variances, which need no data. */
export interface Whitening {
  readonly gapDays: readonly number[];
  readonly variances: readonly number[];
  readonly gains: readonly (readonly [number, number, number])[];
}

export function whitening({ days, walks, sigmaTurns }: KnownPulsar): Whitening {
  const gapDays = days.map((day, i) => (i === 0 ? 0 : day - days[i - 1]!));
  let p = [
    [1, 0, 0],
    [0, START_ERRORS[0]! ** 2, 0],
    [0, 0, START_ERRORS[1]! ** 2],
  ];
  const variances: number[] = [];
  const gains: (readonly [number, number, number])[] = [];
  for (const t of gapDays) {
    const f = [
      [1, t, (t * t) / 2],
      [0, 1, t],
      [0, 0, 1],
    ];
    p = plus(times(times(f, p), transposed(f)), walked(t, walks));
    const s = p[0]![0]! + sigmaTurns ** 2;
    const k = [p[0]![0]! / s, p[1]![0]! / s, p[2]![0]! / s] as const;
    variances.push(s);
    gains.push(k);
    // Joseph's form keeps the covariance positive.
    const a = [
      [1 - k[0], 0, 0],
      [-k[1], 1, 0],
      [-k[2], 0, 1],
    ];
    const measured = k.map((left) => k.map((right) => left * right * sigmaTurns ** 2));
    p = plus(times(times(a, p), transposed(a)), measured);
  }
  return { gapDays, variances, gains };
}

/** Covariance of the walks over a gap: ∫ g(t−s) g(t−s)ᵀ ds for white noise in phase, rate and second rate. */
function walked(t: number, { phaseWalk, frequencyWalk, torqueWalk }: Walks): number[][] {
  return [
    [phaseWalk * t + (frequencyWalk * t ** 3) / 3 + (torqueWalk * t ** 5) / 20, 0, (torqueWalk * t ** 3) / 6],
    [(frequencyWalk * t ** 2) / 2 + (torqueWalk * t ** 4) / 8, frequencyWalk * t + (torqueWalk * t ** 3) / 3, 0],
    [0, (torqueWalk * t ** 2) / 2, torqueWalk * t],
  ].map((row, i, all) => row.map((x, j) => (x === 0 ? all[j]![i]! : x)));
}

/** Innovations of quiet deviations, turns, that are known up to whole turns, and of what comes late on top of them. */
export function innovationsOf(law: Whitening, quiet: readonly number[], late: readonly number[]): number[] {
  const state: [number, number, number] = [0, 0, 0];
  const lateState: [number, number, number] = [0, 0, 0];
  return quiet.map((deviation, i) => {
    carry(state, law.gapDays[i]!);
    carry(lateState, law.gapDays[i]!);
    const rest = deviation - state[0];
    const e = rest - Math.round(rest);
    const lateE = late[i]! - lateState[0];
    for (let j = 0; j < 3; j++) {
      state[j]! += law.gains[i]![j]! * e;
      lateState[j]! += law.gains[i]![j]! * lateE;
    }
    return e + lateE;
  });
}

function carry(state: [number, number, number], t: number): void {
  state[0] += t * state[1] + ((t * t) / 2) * state[2];
  state[1] += t * state[2];
}

/** One possible epoch: its mark on the innovations, and the log likelihood ratio so far. */
interface Candidate {
  readonly mark: [number, number, number];
  sum: number;
}

/** What the step at a place in the gap before arrival `index` adds to the innovations from there on. */
function markOf(law: Whitening, index: number, place: number, deltaNuHz: number): number[] {
  const mark = enter(law, index, place, deltaNuHz);
  const shifts: number[] = [];
  for (let i = index; i < law.gapDays.length; i++) {
    if (i > index) carry(mark, law.gapDays[i]!);
    shifts.push(mark[0]);
    absorb(mark, law, i);
  }
  return shifts;
}

function enter({ gapDays }: Whitening, index: number, place: number, deltaNuHz: number): [number, number, number] {
  const rate = -deltaNuHz * SECONDS_PER_DAY;
  return [rate * gapDays[index]! * (1 - place), rate, 0];
}

function absorb(mark: [number, number, number], { gains }: Whitening, i: number): void {
  const shift = mark[0];
  for (let j = 0; j < 3; j++) mark[j]! -= gains[i]![j]! * shift;
}

/** Takes innovations in one by one, from an arrival on. */
function pageTest(law: Whitening, deltaNuHz: number): (index: number, innovation: number) => readonly Candidate[] {
  const candidates: Candidate[] = [];
  return (i, e) => {
    for (const { mark } of candidates) carry(mark, law.gapDays[i]!);
    for (const place of PLACES_IN_GAP) candidates.push({ mark: enter(law, i, place, deltaNuHz), sum: 0 });
    for (const candidate of candidates) {
      const shift = candidate.mark[0];
      candidate.sum += (shift * (e - shift / 2)) / law.variances[i]!;
      absorb(candidate.mark, law, i);
    }
    return candidates;
  };
}

const largest = (candidates: readonly Candidate[]) => candidates.reduce((most, { sum }) => Math.max(most, sum), 0);

/** Index of the arrival at which the sum passes the threshold; null where it never does. */
export function alarmAt(
  law: Whitening,
  innovations: readonly number[],
  test: { readonly from: number; readonly deltaNuHz: number; readonly threshold: number },
): number | null {
  const next = pageTest(law, test.deltaNuHz);
  for (let i = test.from; i < innovations.length; i++) if (largest(next(i, innovations[i]!)) > test.threshold) return i;
  return null;
}

/** Arrivals from the step on after which its expected log likelihood ratio is `nats`; by fractions of an arrival. */
export function arrivalsUntil(law: Whitening, index: number, deltaNuHz: number, nats: number): number {
  let expected = 0;
  const shifts = markOf(law, index, 0.5, deltaNuHz);
  for (let n = 0; n < shifts.length; n++) {
    const gained = shifts[n]! ** 2 / (2 * law.variances[index + n]!);
    if (expected + gained >= nats) return n + (nats - expected) / gained;
    expected += gained;
  }
  return Number.POSITIVE_INFINITY;
}

const LEVELS = Array.from({ length: 69 }, (_, k) => 3 + k / 4);

/**
 * The threshold with `perYear` false alarms. Each simulated programme has a step at a place drawn evenly, and an alarm
 * counts by its likelihood without a step over that with one: rare alarms, few programmes (importance sampling: Pollak 1987,
 * Ann. Statist. 15, 749). Beyond the last level that was reached the rate falls as e^(−threshold).
 */
export function thresholdFor(
  law: Whitening,
  test: { readonly from: number; readonly deltaNuHz: number; readonly perYear: number; readonly programmes: number },
  random: Dice,
): number {
  const { from, deltaNuHz, programmes } = test;
  const count = law.gapDays.length;
  const years = law.gapDays.slice(from).reduce((sum, t) => sum + t, 0) / 365.25;
  const places = (count - from) * PLACES_IN_GAP.length;
  const perYear = LEVELS.map(() => 0);
  for (let n = 0; n < programmes; n++) {
    const start = from + Math.floor(((n + random.uniform()) / programmes) * (count - from));
    const place = PLACES_IN_GAP[Math.floor(random.uniform() * PLACES_IN_GAP.length)]!;
    const shifts = markOf(law, start, place, deltaNuHz);
    const next = pageTest(law, deltaNuHz);
    let level = 0;
    for (let i = from; i < count && level < LEVELS.length; i++) {
      const candidates = next(i, (shifts[i - start] ?? 0) + Math.sqrt(law.variances[i]!) * random.normal());
      const most = largest(candidates);
      if (most <= LEVELS[level]!) continue;
      const ratios = candidates.reduce((sum, { sum: lambda }) => sum + Math.exp(lambda), places - candidates.length);
      for (; level < LEVELS.length && most > LEVELS[level]!; level++)
        perYear[level]! += places / ratios / (programmes * years);
    }
  }
  const k = perYear.findLastIndex((rate) => rate > test.perYear);
  if (k < 0) return LEVELS[0]!;
  const slope = perYear[k + 1] ? Math.log(perYear[k]! / perYear[k + 1]!) * 4 : 1;
  return LEVELS[k]! + Math.log(perYear[k]! / test.perYear) / slope;
}

type Matrix = readonly (readonly number[])[];
const plus = (a: Matrix, b: Matrix) => a.map((row, i) => row.map((x, j) => x + b[i]![j]!));
const times = (a: Matrix, b: Matrix) =>
  a.map((row) => b[0]!.map((_, j) => row.reduce((sum, x, k) => sum + x * b[k]![j]!, 0)));
const transposed = (a: Matrix) => a[0]!.map((_, j) => a.map((row) => row[j]!));

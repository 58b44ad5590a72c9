import type { CountedArrival, Disturbance } from '../filter/countedArrival.ts';
import { dispersionCoefficient, isInside, type NuisanceLayout, nuisanceLayout } from '../filter/nuisance.ts';
import { arrivalVariance } from '../filter/stateSpace.ts';
import { planWhitening, type WhiteningPlan, whitenColumn } from '../filter/whiteningPlan.ts';
import { applyBasis, emptyBasis, extendBasis, type OrthogonalBasis } from '../math/orthogonalBasis.ts';
import type { NoiseModel } from '../report.ts';

/** What every fit of one event to one pulsar's arrivals starts from. */
export interface EventData {
  readonly arrivals: readonly CountedArrival[];
  readonly noise: NoiseModel;
  /** The event lies in one of the gaps before arrivals `first..last` (indices into `arrivals`). */
  readonly firstGapBeforeIndex: number;
  readonly lastGapBeforeIndex: number;
  /** Other events, each a free step. */
  readonly disturbances: readonly Disturbance[];
  /** Exponentials of other events, each a free amplitude beside their step. */
  readonly otherRecoveries?: readonly OtherRecovery[];
}

/** An exponential that another event brought: from arrival `beforeIndex` on. */
export interface OtherRecovery {
  readonly beforeIndex: number;
  readonly timescaleDays: number;
}

/** A stretch without arrivals in use, in which the event may lie. */
export interface CandidateGap {
  /** Position, among the arrivals in use, of the first after the gap. */
  readonly after: number;
  readonly endDays: number;
  readonly lengthDays: number;
}

/**
 * The arrivals in use, whitened, with everything but the event (spin, offsets, dispersion, other events) already
 * projected out under flat priors: what is left of any column after `reduce` is what can speak about the event.
 */
export interface EventFrame {
  readonly arrivals: readonly CountedArrival[];
  readonly plan: WhiteningPlan;
  readonly nuisance: OrthogonalBasis;
  /** The deviations, reduced. */
  readonly data: Float64Array;
  readonly gaps: readonly CandidateGap[];
  /** Total length of the gaps. */
  readonly windowDays: number;
}

/** @throws RangeError when no gap has arrivals in use on both sides. */
export function eventFrame(event: EventData): EventFrame {
  const { arrivals: all, noise, disturbances } = event;
  const indices = all.flatMap(({ used }, index) => (used ? [index] : []));
  const arrivals = indices.map((index) => all[index]!);
  const gaps = candidateGaps(arrivals, indices, event);
  const plan = planWhitening(
    arrivals.map(({ tDays }) => tDays),
    arrivals.map(({ sigmaTurns }) => arrivalVariance(sigmaTurns, noise)),
    noise,
  );
  const nuisance = emptyBasis(arrivals.length);
  const add = (from: number, value: (arrival: CountedArrival) => number): void => {
    const column = eventColumn(arrivals, from, value);
    whitenColumn(plan, column, from);
    extendBasis(nuisance, column);
  };
  const layout = nuisanceLayout(arrivals);
  addSpin(arrivals, 0, add);
  for (const group of layout.offsetStates.keys()) add(0, (arrival) => (arrival.group === group ? 1 : 0));
  if (layout.dispersionState !== null) add(0, (arrival) => dispersionCoefficient(arrival.frequencyMhz));
  for (const disturbance of disturbances) {
    if (!isInside(disturbance, indices[0]!, indices.at(-1)!)) continue;
    const from = indices.findIndex((index) => index >= disturbance.beforeIndex);
    addDisturbance(disturbance, arrivals, from, layout, add);
  }
  for (const { beforeIndex, timescaleDays } of event.otherRecoveries ?? []) {
    if (beforeIndex <= indices[0]! || beforeIndex > indices.at(-1)!) continue;
    const from = indices.findIndex((index) => index >= beforeIndex);
    const start = arrivals[from]!.tDays;
    add(from, ({ tDays }) => Math.exp(-(tDays - start) / timescaleDays));
  }
  const data = Float64Array.from(arrivals, ({ deviationTurns }) => deviationTurns);
  const frame = {
    arrivals,
    plan,
    nuisance,
    data,
    gaps,
    windowDays: gaps.reduce((sum, gap) => sum + gap.lengthDays, 0),
  };
  reduce(frame, data, 0);
  return frame;
}

/** The raw column of an event that enters at position `from`. */
export function eventColumn(
  arrivals: readonly CountedArrival[],
  from: number,
  value: (arrival: CountedArrival) => number,
): Float64Array {
  const column = new Float64Array(arrivals.length);
  for (let i = from; i < arrivals.length; i++) column[i] = value(arrivals[i]!);
  return column;
}

/** Whitens a raw column and removes what the nuisance parameters can mimic, in place; entries `nuisance.rank …` remain. */
export function reduce(frame: EventFrame, column: Float64Array, from: number): void {
  whitenColumn(frame.plan, column, from);
  applyBasis(frame.nuisance, column);
  column.fill(0, 0, frame.nuisance.rank);
}

type AddColumn = (from: number, value: (arrival: CountedArrival) => number) => void;

/** Phase, rate and second rate free from position `from` on, scaled to the span so that the columns are comparable. */
function addSpin(arrivals: readonly CountedArrival[], from: number, add: AddColumn): void {
  const start = arrivals[from]!.tDays;
  const span = Math.max(arrivals.at(-1)!.tDays - start, 1);
  for (const power of [0, 1, 2]) add(from, ({ tDays }) => ((tDays - start) / span) ** power);
}

function addDisturbance(
  disturbance: Disturbance,
  arrivals: readonly CountedArrival[],
  from: number,
  layout: NuisanceLayout,
  add: AddColumn,
): void {
  switch (disturbance.kind) {
    case 'spin':
      addSpin(arrivals, from, add);
      break;
    case 'phase':
      add(from, () => 1);
      break;
    case 'offset': {
      const group = disturbance.group ?? 0;
      add(from, (arrival) => (arrival.group === group ? 1 : 0));
      break;
    }
    case 'dispersion':
      if (layout.dispersionState === null) add(from, () => 1);
      else add(from, (arrival) => dispersionCoefficient(arrival.frequencyMhz));
  }
}

function candidateGaps(
  arrivals: readonly CountedArrival[],
  indices: readonly number[],
  event: EventData,
): readonly CandidateGap[] {
  const gaps: CandidateGap[] = [];
  for (let after = 1; after < arrivals.length; after++) {
    // The gap in use runs from indices[after-1] to indices[after]; set-aside arrivals inside it do not divide it.
    if (indices[after]! < event.firstGapBeforeIndex || indices[after - 1]! >= event.lastGapBeforeIndex) continue;
    const endDays = arrivals[after]!.tDays;
    const lengthDays = endDays - arrivals[after - 1]!.tDays;
    if (lengthDays > 0) gaps.push({ after, endDays, lengthDays });
  }
  if (gaps.length === 0) {
    throw new RangeError(
      `an event before arrivals ${event.firstGapBeforeIndex} to ${event.lastGapBeforeIndex} has no gap between arrivals in use`,
    );
  }
  return gaps;
}

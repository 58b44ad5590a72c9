/** How big: the exact fit of one event to the counted arrivals around it, whichever kind it is. */

import type { CountedArrival } from '../filter/countedArrival.ts';
import { fitGlitch, type GlitchFit } from '../recovery/glitchFit.ts';
import type { Estimate } from '../recovery/mixture.ts';
import { fitStep, type StepFit } from '../recovery/stepFit.ts';
import type { NoiseModel } from '../report.ts';
import { type Alias, aliasesOf } from './aliases.ts';
import { bestOf, countedArrivals, disturbances } from './counts.ts';
import type { Hypothesis } from './hypothesis.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import { groupsOfSite } from './timeline.ts';
import type { Track } from './track.ts';

/** The fit of one event; `arrivals` are those it rests on, with `first` the index of the first of them. */
export interface Measurement {
  readonly glitch: GlitchFit | null;
  readonly step: StepFit | null;
  readonly epochDays: Estimate;
  readonly aliases: readonly Alias[];
  readonly arrivals: readonly CountedArrival[];
  readonly first: number;
  /** Deviation that the event adds to an arrival, turns. */
  readonly curve: (arrival: Pick<CountedArrival, 'tDays' | 'frequencyMhz' | 'group'>) => number;
  /** What it adds to ν, Hz. */
  readonly frequencyCurve: (tDays: number) => number;
}

/** What a measurement was made from: while it is the same, so is the measurement. */
interface Basis {
  readonly noise: NoiseModel;
  readonly arrivals: number;
  readonly marks: string;
}

export interface MeasuredTrack {
  readonly basis: Basis;
  readonly measurement: Measurement | null;
}

/** Arrivals on each side of the event that the fit rests on. */
const REACH = 200;
/** The fit looks at no more candidate gaps than this on each side of the best. */
const MOST_GAPS = 4;

export function measure(watch: PulsarWatch, track: Track): Measurement | null {
  const h = holderOf(watch, track);
  const from = Math.max(0, track.bestGap - REACH);
  const until = Math.min(watch.line.seen.length, track.bestGap + REACH);
  const others = disturbances(watch, track).filter((d) => d.beforeIndex > from && d.beforeIndex < until);
  const marks = JSON.stringify([track.kind, track.bestGap, track.firstGap, track.lastGap, others]);
  const known = watch.measured.get(track.number);
  const basis = { noise: watch.noise, arrivals: until, marks };
  if (known && known.basis.noise === basis.noise && known.basis.arrivals === until && known.basis.marks === marks)
    return known.measurement;
  const arrivals = countedArrivals(watch, h).slice(from, until);
  const measurement = fitted(watch, track, arrivals, from, others);
  watch.measured.set(track.number, { basis, measurement });
  return measurement;
}

/** The heaviest hypothesis that holds the event for true. */
function holderOf(watch: PulsarWatch, track: Track): Hypothesis {
  const bank = watch.bank!;
  const holding =
    track.confirmedAt === null
      ? bank.families.filter((f) => f.kind === track.kind && f.gap === track.bestGap).flatMap((f) => f.beam)
      : [...bank.beam, ...bank.families.flatMap((f) => f.beam)].filter((h) => h.tracks.includes(track.number));
  return holding.length === 0 ? bestOf(watch) : holding.reduce((a, b) => (b.logWeight > a.logWeight ? b : a));
}

function fitted(
  watch: PulsarWatch,
  track: Track,
  arrivals: readonly CountedArrival[],
  from: number,
  others: ReturnType<typeof disturbances>,
): Measurement | null {
  const last = arrivals.length - 1;
  const input = {
    arrivals,
    noise: watch.noise,
    firstGapBeforeIndex: Math.max(1, Math.max(track.firstGap, track.bestGap - MOST_GAPS) - from),
    lastGapBeforeIndex: Math.min(last, Math.min(track.lastGap, track.bestGap + MOST_GAPS) - from),
    disturbances: others.map((d) => ({ ...d, beforeIndex: d.beforeIndex - from })),
    frequencyHz: watch.model.spin.frequencyHz.hi,
    frequencyDerivativeHzPerS: watch.model.spin.frequencyDerivativeHzPerS,
  };
  const used = (a: CountedArrival) => a.used;
  // Without arrivals in use on both sides there is nothing to fit.
  if (!arrivals.slice(0, input.firstGapBeforeIndex).some(used)) return null;
  if (!arrivals.slice(input.lastGapBeforeIndex).some(used)) return null;
  if (track.kind === 'glitch') {
    // Numbered pulses leave no other counts to try.
    const numbered = watch.line.seen[track.bestGap]!.arrival.pulseNumber !== null;
    const { fit, counted, aliases } = numbered
      ? { fit: fitGlitch(input), counted: arrivals, aliases: [] }
      : aliasesOf(input, track.bestGap - from);
    return {
      glitch: fit,
      step: null,
      epochDays: fit.epochDays,
      aliases,
      arrivals: counted,
      first: from,
      curve: (a) => fit.curve(a.tDays),
      frequencyCurve: fit.frequencyCurve,
    };
  }
  const kinds = {
    'clock step': 'time',
    'dispersion step': 'dispersion',
    'spin-down-rate change': 'spin-down rate',
  } as const;
  const groups = track.kind === 'clock step' ? groupsOfSite(watch.line, track.bestGap) : null;
  const step = fitStep({ ...input, kind: kinds[track.kind], ...(groups === null ? {} : { groups }) });
  const epoch = step.bestEpochDays;
  const rate = track.kind === 'spin-down-rate change' ? step.size.mean * 86_400 : 0;
  return {
    glitch: null,
    step,
    epochDays: step.epochDays,
    aliases: [],
    arrivals,
    first: from,
    curve: step.curve,
    frequencyCurve: (t) => (t > epoch ? rate * (t - epoch) : 0),
  };
}

/** How big: the exact fit of one event to the counted arrivals around it, whichever kind it is. */

import type { CountedArrival, Disturbance } from '../filter/countedArrival.ts';
import type { OtherRecovery } from '../recovery/eventFrame.ts';
import { fitGlitch, type GlitchFit, type GlitchFitInput } from '../recovery/glitchFit.ts';
import type { Estimate } from '../recovery/mixture.ts';
import { fitRamp } from '../recovery/rampFit.ts';
import { fitStep, type StepFit } from '../recovery/stepFit.ts';
import type { NoiseModel } from '../report.ts';
import { type Alias, aliasesOf } from './aliases.ts';
import { familyOf } from './bank.ts';
import { bestOf, countedArrivals, disturbances } from './counts.ts';
import type { Hypothesis } from './hypothesis.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import { isSlow } from './slowSpinUp.ts';
import { groupsOfSite } from './timeline.ts';
import type { Shapes, Track } from './track.ts';

/** The fit of one event; `arrivals` are those it rests on, with `first` the index of the first of them. */
export interface Measurement {
  readonly glitch: GlitchFit | null;
  /** What the fit of a glitch started from. */
  readonly glitchInput?: GlitchFitInput;
  readonly step: StepFit | null;
  /** Of a slow spin-up. */
  readonly ramp?: { readonly deltaNuHz: Estimate; readonly durationDays: Estimate };
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

interface Kept {
  readonly basis: Basis;
  readonly measurement: Measurement | null;
  /** With the other sizes weighed; undefined before that is asked for. */
  weighed?: Measurement;
}

/** Measurements of one track: jointly with all events near it, or with the recoveries of the earlier ones alone. */
export type MeasuredTrack = Partial<Record<Scope, Kept>>;
type Scope = 'joint' | 'earlier';

/** Arrivals on each side of the event that the fit rests on. */
const REACH = 200;
/** The fit looks at no more candidate gaps than this on each side of the best. */
const MOST_GAPS = 4;
/** Exponentials looked for. */
const MOST_TERMS = { suspected: 0, confirmed: 3, withdrawn: 0 } as const;

/**
 * The event fitted jointly with those near it: their steps free, and their recoveries too, at their own timescales. The counts
 * are those that the detector follows.
 */
export function measure(watch: PulsarWatch, track: Track): Measurement | null {
  return measured(watch, track, 'joint').measurement;
}

/** The same for the record: of a confirmed glitch, the sizes that go with other counts are weighed too, and the best is taken. */
export function measureForRecord(watch: PulsarWatch, track: Track): Measurement | null {
  const kept = measured(watch, track, 'joint');
  const { measurement } = kept;
  // Numbered pulses leave no other counts to try.
  const numbered = watch.line.seen[track.bestGap]!.arrival.pulseNumber !== null;
  if (track.state !== 'confirmed' || measurement?.glitchInput === undefined || numbered) return measurement;
  const { glitch, glitchInput, first } = measurement;
  if (kept.weighed === undefined) {
    const { fit, counted, aliases } = aliasesOf(glitchInput, glitch!, track.bestGap - first);
    kept.weighed = { ...measurement, ...asGlitch(fit), aliases, arrivals: counted };
  }
  return kept.weighed;
}

function measured(watch: PulsarWatch, track: Track, scope: Scope): Kept {
  const h = holderOf(watch, track);
  const from = Math.max(0, track.bestGap - REACH);
  const until = Math.min(watch.line.seen.length, track.bestGap + REACH);
  const inReach = (d: { readonly beforeIndex: number }) => d.beforeIndex > from && d.beforeIndex < until;
  const others = {
    steps: disturbances(watch, track).filter(inReach),
    recoveries: otherRecoveries(watch, track, scope).filter(inReach),
  };
  const marks = JSON.stringify([
    track.kind,
    track.state,
    track.shapes,
    track.bestGap,
    track.firstGap,
    track.lastGap,
    others,
  ]);
  const all = watch.measured.get(track.number) ?? {};
  // Without later recoveries both scopes are one and the same fit.
  for (const known of [all.joint, all.earlier]) {
    const basis = known?.basis;
    if (basis?.noise === watch.noise && basis.arrivals === until && basis.marks === marks) return known!;
  }
  const arrivals = countedArrivals(watch, h).slice(from, until);
  const measurement = fitted(watch, track, arrivals, from, others);
  const kept = { basis: { noise: watch.noise, arrivals: until, marks }, measurement };
  watch.measured.set(track.number, { ...all, [scope]: kept });
  return kept;
}

interface Others {
  readonly steps: readonly Disturbance[];
  readonly recoveries: readonly OtherRecovery[];
}

/** Those of confirmed glitches. Each is measured with the earlier ones only, so that no two wait for each other. */
function otherRecoveries(watch: PulsarWatch, track: Track, scope: Scope): OtherRecovery[] {
  return watch.tracks
    .filter((t) => t !== track && t.state === 'confirmed' && t.kind === 'glitch' && t.partOf === null)
    .filter((t) => Math.abs(t.bestGap - track.bestGap) < REACH && (scope === 'joint' || t.bestGap < track.bestGap))
    .flatMap((t) => {
      const terms = measured(watch, t, 'earlier').measurement?.glitch?.recovery?.terms ?? [];
      return terms.map((term) => ({ beforeIndex: t.bestGap, timescaleDays: term.timescaleDays.median }));
    });
}

/** The heaviest hypothesis that holds the event for true. */
function holderOf(watch: PulsarWatch, track: Track): Hypothesis {
  const bank = watch.bank!;
  const holding =
    track.confirmedAt === null
      ? (familyOf(bank, track.kind, track.bestGap)?.beam ?? [])
      : [...bank.beam, ...bank.families.flatMap((f) => f.beam)].filter((h) => h.tracks.includes(track.number));
  return holding.length === 0 ? bestOf(watch) : holding.reduce((a, b) => (b.logWeight > a.logWeight ? b : a));
}

function fitted(
  watch: PulsarWatch,
  track: Track,
  arrivals: readonly CountedArrival[],
  from: number,
  others: Others,
): Measurement | null {
  if (track.kind === 'lost count') return null;
  const last = arrivals.length - 1;
  const input = {
    arrivals,
    noise: watch.noise,
    firstGapBeforeIndex: Math.max(1, Math.max(track.firstGap, track.bestGap - MOST_GAPS) - from),
    lastGapBeforeIndex: Math.min(last, Math.min(track.lastGap, track.bestGap + MOST_GAPS) - from),
    disturbances: others.steps.map((d) => ({ ...d, beforeIndex: d.beforeIndex - from })),
    otherRecoveries: others.recoveries.map((r) => ({ ...r, beforeIndex: r.beforeIndex - from })),
    mostTerms: MOST_TERMS[track.state],
    frequencyHz: watch.model.spin.frequencyHz.hi,
    frequencyDerivativeHzPerS: watch.model.spin.frequencyDerivativeHzPerS,
  };
  const used = (a: CountedArrival) => a.used;
  // Without arrivals in use on both sides there is nothing to fit.
  if (!arrivals.slice(0, input.firstGapBeforeIndex).some(used)) return null;
  if (!arrivals.slice(input.lastGapBeforeIndex).some(used)) return null;
  if (track.shapes !== null && isSlow(track)) return asRamp(input, from, track.shapes);
  if (track.kind === 'glitch') {
    return { ...asGlitch(fitGlitch(input)), glitchInput: input, aliases: [], arrivals, first: from };
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

function asGlitch(fit: GlitchFit) {
  return {
    glitch: fit,
    step: null,
    epochDays: fit.epochDays,
    curve: (a: Pick<CountedArrival, 'tDays'>) => fit.curve(a.tDays),
    frequencyCurve: fit.frequencyCurve,
  };
}

/** A slow rise, wherever among the gaps of its shape it began. */
function asRamp(input: Parameters<typeof fitRamp>[0], from: number, { firstGap, lastGap }: Shapes): Measurement {
  const { step, durationDays, frequencyCurve } = fitRamp({
    ...input,
    firstGapBeforeIndex: firstGap - from,
    lastGapBeforeIndex: lastGap - from,
  });
  return {
    glitch: null,
    step: null,
    ramp: { deltaNuHz: step.size, durationDays },
    epochDays: step.epochDays,
    aliases: [],
    arrivals: input.arrivals,
    first: from,
    curve: step.curve,
    frequencyCurve,
  };
}

import type { CountedArrival } from '../filter/countedArrival.ts';
import { dispersionCoefficient } from '../filter/nuisance.ts';
import { logSumExp } from '../math/logSumExp.ts';
import { type CandidateGap, type EventData, type EventFrame, eventColumn, eventFrame, reduce } from './eventFrame.ts';
import { type Estimate, gridEstimate, mixtureEstimate } from './mixture.ts';

const SECONDS_PER_DAY = 86_400;
/** Evenly spaced epochs tried in each gap; a ramp begins too gently for its first day to matter. */
const EPOCHS = 40;
const RAMP_EPOCHS = 6;

/**
 * `time`: arrivals come late by a fixed time, as when a clock or an instrument changes. `dispersion`: late by a time
 * ∝ f⁻². `spin-down rate`: ν̇ changes, phase and ν are continuous. `ramp`: ν rises evenly over `durationDays`, then keeps
 * what it has gained.
 */
export type StepKind = 'time' | 'dispersion' | 'spin-down rate' | 'ramp';

export interface StepFitInput extends EventData {
  readonly kind: StepKind;
  readonly frequencyHz: number;
  readonly frequencyDerivativeHzPerS: number;
  /** A step of these groups alone; absent: of all arrivals. */
  readonly groups?: readonly number[];
  /** Of a ramp. */
  readonly durationDays?: number;
}

export interface StepFit {
  /** Natural logs, on the same scale as those of `fitGlitch` for the same arrivals, noise and gaps. */
  readonly logEvidenceNone: number;
  readonly logEvidenceStep: number;
  /** Most probable epoch, days from the pivot; the middle of the gap where the data cannot tell. */
  readonly bestEpochDays: number;
  readonly epochDays: Estimate;
  /** µs late (`dispersion`: at 1400 MHz), Hz/s, or Hz gained over a ramp. */
  readonly size: Estimate;
  /** Deviation (turns, late positive) that the most probable step adds. */
  readonly curve: (arrival: Pick<CountedArrival, 'tDays' | 'frequencyMhz' | 'group'>) => number;
}

/**
 * The posterior of a step with one size, flat in its epoch over the candidate gaps. Prior on the size: zero-mean
 * Gaussians on a ladder of widths, each as likely as the next: 1 µs … a quarter turn, 1e-4 … 1 of ν̇,
 * or 1e-10 … 1e-5 of ν.
 * @throws RangeError when no candidate gap lies between arrivals in use.
 */
export function fitStep(input: StepFitInput): StepFit {
  const frame = eventFrame(input);
  const shape = stepShape(input);
  const candidates = frame.gaps.flatMap((gap) => gapCandidates(frame, gap, shape));
  const square = frame.data.reduce((sum, entry) => sum + entry * entry, 0);
  const widths = sizeWidths(input);
  const points = candidates.flatMap((candidate) => widths.map((width) => stepPoint(candidate, width, square)));
  const logMasses = points.map(
    ({ logMass }, i) => logMass + Math.log(candidates[Math.floor(i / widths.length)]!.weight),
  );
  const logEvidenceStep = logSumExp(logMasses) - Math.log(widths.length);
  const weights = Float64Array.from(logMasses, (mass) => Math.exp(mass - Math.max(...logMasses)));
  const best = points.reduce((a, b) => (b.logMass > a.logMass ? b : a));
  const epochs = Float64Array.from(points, ({ epochDays }) => epochDays);
  return {
    logEvidenceNone: -0.5 * square,
    logEvidenceStep,
    bestEpochDays: shape.continuous ? best.epochDays : middleOfGap(frame, best.epochDays),
    epochDays: gridEstimate(epochs, weights),
    size: mixtureEstimate({
      weights,
      means: Float64Array.from(points, ({ mean }) => mean * shape.unit),
      sds: Float64Array.from(points, ({ sd }) => sd * shape.unit),
    }),
    curve: (arrival) => (arrival.tDays <= best.epochDays ? 0 : best.mean * shape.value(arrival, best.epochDays)),
  };
}

type SeenArrival = Pick<CountedArrival, 'tDays' | 'frequencyMhz' | 'group'>;

interface StepShape {
  /** Deviation of an arrival after the epoch, per unit of size in turns (and days). */
  readonly value: (arrival: SeenArrival, epochDays: number) => number;
  /** From that unit to the unit reported. */
  readonly unit: number;
  /** The data depend on where in the gap the epoch is. */
  readonly continuous: boolean;
  readonly epochs: number;
}

function stepShape({ kind, groups, frequencyHz, durationDays = 1 }: StepFitInput): StepShape {
  const concerns = (arrival: SeenArrival): number => (groups === undefined || groups.includes(arrival.group) ? 1 : 0);
  const microseconds = 1e6 / frequencyHz;
  switch (kind) {
    case 'time':
      return { value: concerns, unit: microseconds, continuous: false, epochs: EPOCHS };
    case 'dispersion':
      return {
        value: (arrival) => concerns(arrival) * dispersionCoefficient(arrival.frequencyMhz),
        unit: microseconds,
        continuous: false,
        epochs: EPOCHS,
      };
    case 'spin-down rate':
      return {
        value: (arrival, epochDays) => -0.5 * concerns(arrival) * (arrival.tDays - epochDays) ** 2,
        unit: 1 / (SECONDS_PER_DAY * SECONDS_PER_DAY),
        continuous: true,
        epochs: EPOCHS,
      };
    case 'ramp':
      return {
        value: (arrival, epochDays) => {
          const since = arrival.tDays - epochDays;
          const rising = Math.min(since, durationDays);
          return -concerns(arrival) * ((rising * rising) / (2 * durationDays) + since - rising);
        },
        unit: 1 / SECONDS_PER_DAY,
        continuous: true,
        epochs: RAMP_EPOCHS,
      };
  }
}

/** Turns (and days). */
function sizeWidths({ kind, frequencyHz, frequencyDerivativeHzPerS }: StepFitInput): number[] {
  if (kind === 'spin-down rate') {
    const spinDown = Math.max(Math.abs(frequencyDerivativeHzPerS), 1e-18) * SECONDS_PER_DAY * SECONDS_PER_DAY;
    return [1e-4, 1e-3, 1e-2, 1e-1, 1].map((part) => part * spinDown);
  }
  if (kind === 'ramp') return [1e-10, 1e-9, 1e-8, 1e-7, 1e-6, 1e-5].map((part) => part * frequencyHz * SECONDS_PER_DAY);
  const widths = [1, 10, 100, 1e3, 1e4, 1e5].map((us) => us * 1e-6 * frequencyHz).filter((turns) => turns < 0.25);
  return [...widths, 0.25];
}

interface StepCandidate {
  readonly epochDays: number;
  /** Prior probability. */
  readonly weight: number;
  readonly columnSquare: number;
  readonly columnData: number;
}

function gapCandidates(frame: EventFrame, gap: CandidateGap, shape: StepShape): StepCandidate[] {
  const weight = gap.lengthDays / frame.windowDays / shape.epochs;
  let held: StepCandidate | null = null;
  return Array.from({ length: shape.epochs }, (_, i) => {
    const epochDays = gap.endDays - ((i + 0.5) / shape.epochs) * gap.lengthDays;
    if (held && !shape.continuous) return { ...held, epochDays };
    const column = eventColumn(frame.arrivals, gap.after, (arrival) => shape.value(arrival, epochDays));
    reduce(frame, column, gap.after);
    let columnSquare = 0;
    let columnData = 0;
    for (let row = 0; row < column.length; row++) {
      columnSquare += column[row]! * column[row]!;
      columnData += column[row]! * frame.data[row]!;
    }
    held = { epochDays, weight, columnSquare, columnData };
    return held;
  });
}

interface StepPoint {
  readonly epochDays: number;
  readonly logMass: number;
  readonly mean: number;
  readonly sd: number;
}

/** One parameter with a Gaussian prior: evidence and posterior in closed form. */
function stepPoint(candidate: StepCandidate, width: number, square: number): StepPoint {
  const { epochDays, columnSquare, columnData } = candidate;
  const precision = columnSquare + 1 / (width * width);
  const mean = columnData / precision;
  const logMass = -0.5 * (square - columnData * mean) - 0.5 * Math.log(precision * width * width);
  return { epochDays, logMass, mean, sd: 1 / Math.sqrt(precision) };
}

function middleOfGap(frame: EventFrame, epochDays: number): number {
  const gap = frame.gaps.find(({ endDays }) => endDays >= epochDays)!;
  return gap.endDays - 0.5 * gap.lengthDays;
}

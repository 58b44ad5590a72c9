/**
 * The pulsar once more, as a noise model would have it: from its last arrival on, at its own recent cadence, with its own
 * uncertainties and receivers. Two banks watch it: one knows the noise as it is, the other was told what was learned.
 */

import { arrivalVariance, SPIN_STATES, writeProcessNoise } from '../filter/stateSpace.ts';
import { choleskyFactor } from '../math/cholesky.ts';
import type { NoiseModel } from '../report.ts';
import { newBank } from '../steps/bank.ts';
import { copyOf, gapOf, type Hypothesis, propagate, zeros } from '../steps/hypothesis.ts';
import type { PulsarWatch } from '../steps/pulsarWatch.ts';
import { stepAt } from '../steps/stepAt.ts';
import { observationOf, type Seen } from '../steps/timeline.ts';
import type { RandomStream } from './randomStream.ts';

/** So many of the latest arrivals stand for the cadence. */
export const RECENT_ARRIVALS = 100;
/** Share of arrivals that lie anywhere within the turn, as the bank expects. */
const OUTLIER_SHARE = 0.02;

/** A step that truly happens before an arrival. */
export interface PlannedStep {
  readonly beforeIndex: number;
  /** Covariance of the jump over all states, row-major. */
  readonly covariance: readonly number[];
}

export interface RehearsedPulsar {
  readonly knowing: PulsarWatch;
  readonly deciding: PulsarWatch;
  /** Takes the next arrival in. */
  next(): void;
}

/** Its recent arrivals in their order, begun anywhere and gone round: gaps, sessions, uncertainties, receivers. */
export function recentCadence({ line: { seen } }: PulsarWatch, count: number, random: RandomStream): Seen[] {
  const oldest = Math.max(1, seen.length - RECENT_ARRIVALS);
  const offset = Math.floor(random.uniform() * (seen.length - oldest));
  const found: Seen[] = [];
  for (let i = 0; i < count; i++) {
    const at = oldest + ((offset + i) % (seen.length - oldest));
    const last = found.at(-1);
    const gapDays = seen[at]!.tDays - seen[at - 1]!.tDays;
    const newSession = seen[at]!.session === seen[at - 1]!.session ? 0 : 1;
    const tDays = last === undefined ? 0 : last.tDays + gapDays;
    const session = last === undefined ? 0 : last.session + newSession;
    found.push({ ...seen[at]!, tDays, session, deviation: 0, modelPulse: seen[at]!.arrival.pulseNumber ?? 0 });
  }
  return found;
}

export function rehearse(
  real: PulsarWatch,
  cadence: readonly Seen[],
  noise: NoiseModel,
  step: PlannedStep | null,
  random: RandomStream,
): RehearsedPulsar {
  const known: Hypothesis = {
    ...copyOf(real.bank!.beam[0]!, []),
    mean: zeros(real.states.size),
    logWeight: 0,
    story: { index: 0, turns: 0, used: true, slipped: false, before: null },
    lastSetAside: false,
    numbering: 0,
  };
  const truth = drawn(known.cov, random);
  const line = { ...real.line, seen: [cadence[0]!] };
  const told = (what: NoiseModel): PulsarWatch => {
    const bank = newBank(what, [copyOf(known)], { index: 0, tDays: cadence[0]!.tDays }, real.states.decays);
    return { ...real, line, bank, noise: what, oldestGap: 1, tracks: [] };
  };
  const knowing = told(noise);
  const deciding = told(real.noise);
  const next = (): void => {
    const index = line.seen.length;
    const seen = cadence[index]!;
    walk(truth, seen.tDays - cadence[index - 1]!.tDays, knowing, random);
    if (index === step?.beforeIndex) addTo(truth, drawn(step.covariance, random));
    line.seen.push(seen);
    line.seen[index] = shown(knowing, index, truth, random);
    stepAt(knowing, index, true);
    stepAt(deciding, index, true);
  };
  return { knowing, deciding, next };
}

/** The arrival with the deviation that it shows, and the number of its turn. */
function shown(watch: PulsarWatch, index: number, truth: readonly number[], random: RandomStream): Seen {
  const seen = watch.line.seen[index]!;
  const { row } = observationOf(watch.line, index, watch.states, watch.noise).sight;
  const error = Math.sqrt(arrivalVariance(seen.sigmaTurns, watch.noise)) * random.normal();
  const astray = random.uniform() < OUTLIER_SHARE ? random.uniform() : 0;
  const turns = truth.reduce((sum, x, i) => sum + x * row[i]!, error + astray);
  const whole = Math.round(turns);
  return { ...seen, deviation: turns - whole, modelPulse: seen.modelPulse + whole };
}

/** x ← F x + the walks of the gap. */
function walk(truth: number[], gapDays: number, watch: PulsarWatch, random: RandomStream): void {
  const { noise, states } = watch;
  const exact = { ...watch.bank!.beam[0]!, mean: truth, cov: zeros(truth.length ** 2) };
  propagate(exact, gapOf(gapDays, noise, states.decays));
  const added = new Float64Array(SPIN_STATES * SPIN_STATES);
  writeProcessNoise(gapDays, noise, added);
  addTo(truth, drawn(added, random));
}

function addTo(state: number[], change: readonly number[]): void {
  for (let i = 0; i < change.length; i++) state[i]! += change[i]!;
}

/** A draw from the normal distribution of this covariance; directions without variance stay 0. */
export function drawn(covariance: ArrayLike<number>, random: RandomStream): number[] {
  const size = Math.sqrt(covariance.length);
  const root = Float64Array.from(covariance);
  choleskyFactor(root, size);
  const normals = Array.from({ length: size }, () => random.normal());
  return normals.map((_, i) => normals.slice(0, i + 1).reduce((sum, x, j) => sum + root[i * size + j]! * x, 0));
}

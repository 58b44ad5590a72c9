import { daysBetween, type Mjd, SECONDS_PER_DAY } from '../time/mjd.ts';
import type { KnownGlitch, PulsarModel } from './pulsarModel.ts';
import { rebasedSpin, withoutWholeTurns } from './rebasedSpin.ts';
import { phaseEvaluator } from './spinDownModel.ts';

/**
 * How far the rotation has departed from the start model, at one date: deviation (late positive), its rate and second derivative
 * in turns and days, and the part of the rate that is decaying.
 */
export interface FollowedRotation {
  readonly atTdb: Mjd;
  readonly turns: number;
  readonly turnsPerDay: number;
  readonly turnsPerDay2: number;
  readonly decays: readonly { readonly turnsPerDay: number; readonly timescaleDays: number }[];
}

/** A glitch that the start model does not know of: what it leaves for good, and the recoveries that are established. */
export type SeenGlitch = Omit<KnownGlitch, 'phaseTurns'>;

/** The time of an arrival with what its receiver and the dispersion add taken off, turns late. */
export interface ReferenceArrival {
  readonly tdb: Mjd;
  readonly addedTurns: number;
  readonly sigmaTurns: number;
}

/** A decaying part older than so many timescales is so small that two terms of its series will do: e⁻⁵ is below 1 %. */
const FOLLOWED_TIMESCALES = 5;

/**
 * The start model brought to where the rotation has gone: φ = φ_start − deviation, written about the last whole day before the
 * date, its known glitches kept and the seen ones beside them. At the date its phase, ν and ν̇ are those of the followed rotation,
 * exactly; from there on the recoveries bend it. Before the last glitch it is as good as the sizes of the glitches, with the
 * phase joined at the arrivals before each of them. While no recovery of the last glitch is established, the decays that the
 * rotation was followed with stand for it.
 *
 * @param glitches oldest first
 * @param before for each glitch the last arrivals before it, oldest first
 */
export function followedModel(
  start: PulsarModel,
  followed: FollowedRotation,
  glitches: readonly SeenGlitch[],
  before: readonly (readonly ReferenceArrival[])[],
): PulsarModel {
  const epochTdb: Mjd = { day: followed.atTdb.day, fraction: 0 };
  const tables = glitches.map((glitch, i) => ({
    phaseTurns: 0,
    ...(i === glitches.length - 1 && glitch.recoveries.length === 0 ? withDecays(glitch, followed) : glitch),
  }));
  const recovering = tables.flatMap((table) =>
    table.recoveries.map((r) => recoveryAt(r, table.epochTdb, followed.atTdb)),
  );
  const x = daysBetween(epochTdb, followed.atTdb);
  const turns = followed.turns + sum(recovering.map((r) => r.turns));
  const rate = sum([followed, ...followed.decays, ...recovering].map((part) => part.turnsPerDay));
  const second =
    followed.turnsPerDay2 -
    sum(followed.decays.map((d) => d.turnsPerDay / d.timescaleDays)) +
    sum(recovering.map((r) => r.turnsPerDay2));
  const steps = tables.map((table) => stepAt(table, epochTdb));
  const spin = rebasedSpin(start, epochTdb, {
    turns: turns + x * (rate + 0.5 * x * second) + sum(steps.map((s) => s.turns)),
    hz: (rate + x * second) / SECONDS_PER_DAY + sum(steps.map((s) => s.hz)),
    hzPerS: second / SECONDS_PER_DAY ** 2 + sum(tables.map((t) => t.frequencyDerivativeStepHzPerS)),
  });
  return joined({ ...start, spin, glitches: inOrder([...start.glitches, ...tables]) }, tables, before);
}

/** The last glitch with what still decays of it, as followed, taken off what it leaves. */
function withDecays(glitch: SeenGlitch, { atTdb, decays }: FollowedRotation): SeenGlitch {
  const age = daysBetween(atTdb, glitch.epochTdb);
  const recoveries = decays
    .filter(({ timescaleDays }) => age >= 0 && age < FOLLOWED_TIMESCALES * timescaleDays)
    .map(({ turnsPerDay, timescaleDays }) => ({
      frequencyStepHz: (-turnsPerDay / SECONDS_PER_DAY) * Math.exp(age / timescaleDays),
      timescaleDays,
    }));
  const frequencyStepHz = glitch.frequencyStepHz - sum(recoveries.map((r) => r.frequencyStepHz));
  return { ...glitch, frequencyStepHz, recoveries };
}

/** What one exponential has added by a date: turns, and their derivatives in days. */
function recoveryAt(
  { frequencyStepHz, timescaleDays }: KnownGlitch['recoveries'][number],
  epochTdb: Mjd,
  at: Mjd,
): { readonly turns: number; readonly turnsPerDay: number; readonly turnsPerDay2: number } {
  const age = Math.max(0, daysBetween(at, epochTdb));
  const turnsPerDay = frequencyStepHz * SECONDS_PER_DAY * Math.exp(-age / timescaleDays);
  return {
    turns: -frequencyStepHz * SECONDS_PER_DAY * timescaleDays * Math.expm1(-age / timescaleDays),
    turnsPerDay,
    turnsPerDay2: -turnsPerDay / timescaleDays,
  };
}

/** Phase and frequency that the lasting part of a glitch has added by a date; before the glitch, its polynomial carried back. */
function stepAt(table: KnownGlitch, at: Mjd): { readonly turns: number; readonly hz: number } {
  const since = daysBetween(at, table.epochTdb) * SECONDS_PER_DAY;
  const { frequencyStepHz, frequencyDerivativeStepHzPerS } = table;
  return {
    turns: since * (frequencyStepHz + 0.5 * since * frequencyDerivativeStepHzPerS),
    hz: frequencyStepHz + since * frequencyDerivativeStepHzPerS,
  };
}

/** Gives each seen glitch the phase step with which the model meets the arrivals before it; the newest first. */
function joined(
  model: PulsarModel,
  tables: readonly KnownGlitch[],
  before: readonly (readonly ReferenceArrival[])[],
): PulsarModel {
  let current = model;
  for (let i = tables.length - 1; i >= 0; i--) {
    const arrivals = before[i] ?? [];
    if (arrivals.length === 0) continue;
    const turns = meanDeviation(current, arrivals);
    const glitches = current.glitches.map((g) =>
      g.epochTdb === tables[i]!.epochTdb ? { ...g, phaseTurns: turns } : g,
    );
    // The polynomial gives away what the step adds after the glitch: there the phase does not move.
    const phaseAtEpochTurns = withoutWholeTurns((current.spin.phaseAtEpochTurns ?? 0) - turns);
    current = { ...current, spin: { ...current.spin, phaseAtEpochTurns }, glitches };
  }
  return current;
}

/** Weighted mean of how late arrivals are against a model, free of jumps by a whole turn. */
function meanDeviation(model: PulsarModel, arrivals: readonly ReferenceArrival[]): number {
  const phaseAt = phaseEvaluator(model);
  const deviations = arrivals.map(({ tdb, addedTurns }) => phaseAt(tdb).deviationTurns - addedTurns);
  const near = deviations.at(-1)!;
  const weights = arrivals.map(({ sigmaTurns }) => 1 / sigmaTurns ** 2);
  const apart = sum(deviations.map((d, i) => weights[i]! * withoutWholeTurns(d - near))) / sum(weights);
  return withoutWholeTurns(near + apart);
}

function inOrder(glitches: readonly KnownGlitch[]): KnownGlitch[] {
  return [...glitches].sort((a, b) => daysBetween(a.epochTdb, b.epochTdb));
}

function sum(values: readonly number[]): number {
  return values.reduce((a, b) => a + b, 0);
}

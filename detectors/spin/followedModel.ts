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

/** A glitch that the start model does not know of. */
export interface SeenGlitch {
  readonly epochTdb: Mjd;
  /** Δν at the glitch, the decaying part included. */
  readonly frequencyStepHz: number;
  readonly frequencyDerivativeStepHzPerS: number;
}

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
 * date, its known glitches kept and the seen ones beside them. After the last glitch its phase is that of the followed rotation,
 * exactly; before it, as good as the sizes of the glitches, with the phase joined at the arrivals before each of them.
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
  const last = glitches.at(-1);
  const age = last === undefined ? Infinity : daysBetween(followed.atTdb, last.epochTdb);
  const open = followed.decays.filter((d) => age >= 0 && age < FOLLOWED_TIMESCALES * d.timescaleDays);
  const spent = followed.decays.filter((d) => !open.includes(d));
  const tables = glitches.map((glitch, i) => glitchTable(glitch, i === glitches.length - 1 ? open : [], age));

  const x = daysBetween(epochTdb, followed.atTdb);
  const rate = followed.turnsPerDay + sum(spent.map((d) => d.turnsPerDay));
  const second = followed.turnsPerDay2 - sum(spent.map((d) => d.turnsPerDay / d.timescaleDays));
  const steps = tables.map((table) => stepAt(table, epochTdb));
  const spin = rebasedSpin(start, epochTdb, {
    turns:
      followed.turns +
      x * (rate + 0.5 * x * second) -
      sum(open.map((d) => d.turnsPerDay * d.timescaleDays * Math.expm1(age / d.timescaleDays))) +
      sum(steps.map((s) => s.turns)),
    hz: (rate + x * second) / SECONDS_PER_DAY + sum(steps.map((s) => s.hz)),
    hzPerS: second / SECONDS_PER_DAY ** 2 + sum(tables.map((t) => t.frequencyDerivativeStepHzPerS)),
  });
  return joined({ ...start, spin, glitches: inOrder([...start.glitches, ...tables]) }, tables, before);
}

function glitchTable(glitch: SeenGlitch, open: FollowedRotation['decays'], ageDays: number): KnownGlitch {
  const recoveries = open.map(({ turnsPerDay, timescaleDays }) => ({
    frequencyStepHz: (-turnsPerDay / SECONDS_PER_DAY) * Math.exp(ageDays / timescaleDays),
    timescaleDays,
  }));
  return {
    epochTdb: glitch.epochTdb,
    phaseTurns: 0,
    frequencyStepHz: glitch.frequencyStepHz - sum(recoveries.map((r) => r.frequencyStepHz)),
    frequencyDerivativeStepHzPerS: glitch.frequencyDerivativeStepHzPerS,
    recoveries,
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

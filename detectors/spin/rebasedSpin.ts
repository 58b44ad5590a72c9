import type { Mjd } from '../time/mjd.ts';
import { add, fromNumber, multiply, toNumber } from './doubleDouble.ts';
import type { DoubleDouble, PulsarModel, SpinDown } from './pulsarModel.ts';
import { phaseEvaluator, secondsBetween } from './spinDownModel.ts';

/** Phase, its rate and its second derivative that are taken off a spin-down, at its epoch: turns, Hz, Hz/s. */
export interface Departure {
  readonly turns: number;
  readonly hz: number;
  readonly hzPerS: number;
}

const NO_DEPARTURE: Departure = { turns: 0, hz: 0, hzPerS: 0 };

/**
 * The same rotation written about another epoch (Taylor's theorem, exact for a polynomial), minus a departure. Whole turns of the
 * phase at the new epoch are dropped: the count starts there. Glitches of the model are not touched: they stand beside the polynomial.
 */
export function rebasedSpin(model: PulsarModel, epochTdb: Mjd, minus: Departure = NO_DEPARTURE): SpinDown {
  const { spin } = model;
  const seconds = secondsBetween(epochTdb, spin.epochTdb);
  const derivatives = [
    spin.frequencyHz,
    fromNumber(spin.frequencyDerivativeHzPerS),
    fromNumber(spin.frequencySecondDerivativeHzPerS2),
    ...(spin.higherFrequencyDerivatives ?? []).map(fromNumber),
  ].map((_, order, all) => taylor(all.slice(order), seconds));
  const [frequency, first, second, ...higher] = derivatives as [DoubleDouble, DoubleDouble, DoubleDouble];
  const { deviationTurns } = phaseEvaluator({ ...model, glitches: [] })(epochTdb);
  return {
    epochTdb,
    frequencyHz: add(frequency, fromNumber(-minus.hz)),
    frequencyDerivativeHzPerS: toNumber(add(first, fromNumber(-minus.hzPerS))),
    frequencySecondDerivativeHzPerS2: toNumber(second),
    ...(higher.length === 0 ? {} : { higherFrequencyDerivatives: (higher as DoubleDouble[]).map(toNumber) }),
    phaseAtEpochTurns: withoutWholeTurns(deviationTurns - minus.turns),
  };
}

/** Into [−0.5, 0.5]. */
export function withoutWholeTurns(turns: number): number {
  return turns - Math.round(turns);
}

/** f(t) from f and its derivatives at 0, by Horner's rule: f + t (f′ + t/2 (f″ + …)). */
function taylor(derivatives: readonly DoubleDouble[], t: DoubleDouble): DoubleDouble {
  let sum = fromNumber(0);
  for (let order = derivatives.length - 1; order >= 0; order--) {
    sum = add(derivatives[order]!, multiply(sum, divided(t, order + 1)));
  }
  return sum;
}

/** t/n, to double-double: the remainder of the first quotient, divided once more. */
function divided(t: DoubleDouble, n: number): DoubleDouble {
  const quotient = t.hi / n;
  const product = multiply(fromNumber(quotient), fromNumber(n));
  const rest = toNumber(add(t, { hi: -product.hi, lo: -product.lo }));
  return add(fromNumber(quotient), fromNumber(rest / n));
}

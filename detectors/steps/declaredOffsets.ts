/** What the operator declares of the receivers: how late their times are, and what that leaves to be learned. */

import type { TimedArrival } from '../arrival.ts';
import { lateByUs } from '../site/siteStep.ts';
import type { DeclaredOffset, PulsarModel } from '../spin/pulsarModel.ts';
import { addSeconds, type Mjd } from '../time/mjd.ts';

type Place = Pick<TimedArrival, 'site' | 'receiver'>;

/** The time of an arrival as a receiver without a declared offset, at a clock that never stepped, would have had it. */
export function withoutOffset(model: PulsarModel, arrival: TimedArrival): Mjd {
  const declared = declaredOffset(model, arrival);
  const lateUs = (declared?.offsetUs ?? 0) + lateByUs(model.siteSteps ?? [], arrival);
  return lateUs === 0 ? arrival.tdb : addSeconds(arrival.tdb, -lateUs * 1e-6);
}

/** σ (s) of what is left of the offset of one receiver against another; null: nothing was declared of it. */
export function offsetUncertaintyS(model: PulsarModel, receiver: Place, reference: Place): number | null {
  const declared = declaredOffset(model, receiver);
  if (declared === null) return null;
  return Math.hypot(declared.uncertaintyUs, declaredOffset(model, reference)?.uncertaintyUs ?? 0) * 1e-6;
}

/** One that names the site stands above one that does not. */
function declaredOffset({ receivers = [] }: PulsarModel, { site, receiver }: Place): DeclaredOffset | null {
  const named = receivers.filter((declared) => declared.receiver === receiver);
  return (
    named.find((declared) => declared.site === site) ?? named.find((declared) => declared.site === undefined) ?? null
  );
}

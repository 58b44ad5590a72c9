import { stepBank } from './bank.ts';
import { birthPlace, clockVariance } from './places.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import { observationOf } from './timeline.ts';

/** One step of the bank at arrival `index`. */
export function stepAt(watch: PulsarWatch, index: number, births: boolean): void {
  const { line, settings } = watch;
  const gapDays = line.seen[index]!.tDays - line.seen[index - 1]!.tDays;
  stepBank(watch.bank!, {
    seen: observationOf(line, index, watch.states, watch.noise),
    tDays: line.seen[index]!.tDays,
    gapDays,
    clockVariance: clockVariance(watch, index),
    place:
      births && gapDays > 0 && (watch.largeStep?.track ?? null) === null ? birthPlace(watch, index, gapDays) : null,
    oldestGap: Math.max(watch.oldestGap, index - settings.windowArrivals + 1),
    carryAll: watch.carriesAll,
  });
}

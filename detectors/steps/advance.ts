/**
 * The fold at the heart: one arrival after the other, in time order, into the bank of hypotheses and a decision.
 */

import type { TimedArrival } from '../arrival.ts';
import { newBank } from './bank.ts';
import { decide } from './decide.ts';
import { withoutOffset } from './declaredOffsets.ts';
import { endTrial, searchLargeStep } from './largeStep.ts';
import { watchCount } from './lostCount.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import { reacquire } from './reacquire.ts';
import { learningDue, relearn } from './relearn.ts';
import { addNuisance, canLock, startBeam } from './start.ts';
import { stepAt } from './stepAt.ts';
import { append } from './timeline.ts';

/** Takes one arrival in. Arrivals must come in time order: an earlier one means a rebuild from the log. */
export function advance(watch: PulsarWatch, arrival: TimedArrival): void {
  const { line } = watch;
  const news = append(line, arrival, watch.phaseAt(withoutOffset(watch.model, arrival)));
  const index = line.seen.length - 1;
  if (watch.bank === null) {
    watch.bank = newBank(watch.noise, startBeam(watch), { index: 0, tDays: line.seen[0]!.tDays }, []);
    return;
  }
  if (news.newGroup) addNuisance(watch, 'offset');
  if (news.newBand) addNuisance(watch, 'dispersion');
  stepAt(watch, index, watch.locked);
  if (watch.lost !== null) reacquire(watch, index);
  else follow(watch, index);
  if (watch.lost === null && learningDue(watch, index)) relearn(watch, index);
}

function follow(watch: PulsarWatch, index: number): void {
  searchLargeStep(watch, index);
  if (watch.locked) {
    decide(watch, index);
    watchCount(watch, index);
  } else if (canLock(watch, index)) {
    // The count that has won tells the noise; it must win with that noise too. It is learned again as soon as ever.
    endTrial(watch);
    const { nextLearning } = watch;
    relearn(watch, index);
    watch.nextLearning = nextLearning;
    if (!canLock(watch, index)) return;
    watch.locked = true;
    watch.lockedFrom = index + 1;
    watch.oldestGap = index + 1;
  }
}

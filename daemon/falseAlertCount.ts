import type { FalseAlertCount } from '../alerts/morningReview.ts';
import type { PulsarEvent } from '../detectors/steps/pulsarEvent.ts';

const DAYS_PER_YEAR = 365.25;

/**
 * What came of the alerts so far. Steps in ν are counted by sign, once for all that were ever suspected and once for the
 * confirmed: noise makes both signs alike, so those down stand for the false ones among those up.
 */
export function falseAlertCount(
  events: readonly PulsarEvent[],
  budgetPerYear: number,
  todayMjd: number,
): FalseAlertCount {
  const alerts = events.filter((event) => event.confirmedAtMjd !== null && event.explanation !== 'bad session');
  const inState = (state: PulsarEvent['state']) => alerts.filter((event) => event.state === state);
  const [accepted, rejected, withdrawn] = [inState('accepted'), inState('rejected'), inState('withdrawn')];
  const inLastYear = (event: PulsarEvent) => todayMjd - event.confirmedAtMjd! < DAYS_PER_YEAR;
  return {
    budgetPerYear,
    confirmed: alerts.length,
    accepted: accepted.length,
    rejected: rejected.length,
    withdrawn: withdrawn.length,
    falseInLastYear: [...rejected, ...withdrawn].filter(inLastYear).length,
    suspectedSteps: bySign(events),
    confirmedSteps: bySign(alerts),
  };
}

function bySign(events: readonly PulsarEvent[]): { readonly up: number; readonly down: number } {
  const count = (explanation: PulsarEvent['explanation']) =>
    events.filter((event) => event.explanation === explanation).length;
  return { up: count('glitch'), down: count('spin-down glitch') };
}

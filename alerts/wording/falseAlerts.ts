import type { FalseAlertCount } from '../morningReview.ts';
import { plain } from './numbers.ts';

/** The budget, what reviewers made of the alerts, and the mirror count: how far an alert may be believed. */
export function falseAlertLines(count: FalseAlertCount): string[] {
  const { confirmed, accepted, rejected, withdrawn, suspectedSteps, confirmedSteps } = count;
  const open = confirmed - accepted - rejected - withdrawn;
  const verdicts =
    confirmed === 0
      ? 'nothing confirmed so far'
      : `confirmed so far ${confirmed}: ${accepted} accepted, ${rejected} rejected, ${withdrawn} withdrawn, ${open} without a verdict`;
  return [
    `Budget ${plain(count.budgetPerYear, 2)} a year, rejected or withdrawn in the last year ${count.falseInLastYear}; ${verdicts}.`,
    `Mirror count: ${suspectedSteps.down} spin-down against ${suspectedSteps.up} spin-up suspected, ${confirmedSteps.down} against ${confirmedSteps.up} confirmed. Noise makes as many of either sign, and glitches spin up.`,
  ];
}

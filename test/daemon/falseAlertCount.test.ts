import { expect, test } from 'vitest';
import { falseAlertCount } from '../../daemon/falseAlertCount.ts';
import type { PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import { GLITCH } from '../alerts/samples.ts';

const TODAY = 60_400;
const event = (given: Partial<PulsarEvent>): PulsarEvent => ({ ...GLITCH, confirmedAtMjd: TODAY - 10, ...given });

test('counts what reviewers made of the alerts, and steps by sign', () => {
  const events = [
    event({ state: 'accepted' }),
    event({ state: 'rejected' }),
    event({ state: 'rejected', confirmedAtMjd: TODAY - 400 }),
    event({ state: 'withdrawn', explanation: 'spin-down glitch' }),
    event({ state: 'withdrawn', explanation: 'spin-down glitch', confirmedAtMjd: null }),
    event({ state: 'suspected', confirmedAtMjd: null }),
    event({ state: 'confirmed', explanation: 'clock step' }),
    event({ state: 'confirmed', explanation: 'bad session' }),
  ];
  expect(falseAlertCount(events, 0.5, TODAY)).toEqual({
    budgetPerYear: 0.5,
    confirmed: 5,
    accepted: 1,
    rejected: 2,
    withdrawn: 1,
    falseInLastYear: 2,
    suspectedSteps: { up: 4, down: 2 },
    confirmedSteps: { up: 3, down: 1 },
  });
});

test('without events everything is zero', () => {
  expect(falseAlertCount([], 1, TODAY)).toMatchObject({ confirmed: 0, confirmedSteps: { up: 0, down: 0 } });
});

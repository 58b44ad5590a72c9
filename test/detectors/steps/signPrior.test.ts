import { expect, it } from 'vitest';
import { logSignPrior } from '../../../detectors/steps/signPrior.ts';
import { modelOf } from '../../support/simulatedWatch.ts';

const pulsar = (frequencyHz: string, frequencyDerivativeHzPerS: number) =>
  modelOf({ frequencyHz, frequencyDerivativeHzPerS, epochMjd: 60_000 });

it('expects rotation-powered pulsars to spin up: 97 in 100 (common practice, no source)', () => {
  // Vela: 11.2 Hz, −1.6e-11 Hz/s (from memory), with a field of 3.4e12 G far below a magnetar's.
  const vela = pulsar('11.19', -1.57e-11);
  expect(logSignPrior(vela, 0)).toBeCloseTo(Math.log(1.94), 12);
  expect(logSignPrior(vela, 1)).toBeCloseTo(Math.log(0.06), 12);
  expect(logSignPrior(vela, 0.5)).toBeCloseTo(0, 12);
});

it('expects either sign of magnetars and of pulsars that accrete', () => {
  // A period of 7 s that grows by 4e-11 s/s has a field of 5e14 G.
  for (const either of [pulsar('0.1433', -8.2e-13), pulsar('0.2', 1e-12)])
    for (const negative of [0, 0.3, 1]) expect(logSignPrior(either, negative)).toBeCloseTo(0, 12);
});

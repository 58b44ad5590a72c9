import { join } from 'node:path';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { digestText } from '../../alerts/index.ts';
import { planOfEvent } from '../../alerts/wording/plan.ts';
import { mjdOf, systemClock } from '../../daemon/clock.ts';
import type { LimitLine } from '../../daemon/commands/limits.ts';
import { morningReview } from '../../daemon/morning.ts';
import { loadOrders, openRecord } from '../../daemon/opening.ts';
import { emptyBatch } from '../../daemon/store/index.ts';
import type { Plan } from '../../detectors/index.ts';
import { createObservatory, type TestObservatory } from '../support/observatory.ts';
import { runSpinvigil, spinvigilJson } from '../support/spinvigil.ts';
import { arrivalFile, syntheticArrivals, syntheticPulsar } from '../support/syntheticPulsar.ts';

// The commands run by the machine's clock: the arrivals end yesterday.
const YESTERDAY = Math.floor(mjdOf(systemClock.now())) - 1;
const START = YESTERDAY - 200;
const quiet = syntheticPulsar({ name: 'KR 0417+31', epochMjd: START, uncertaintyUs: 40 });
const coarse = syntheticPulsar({ name: 'KR 1021-05', epochMjd: START, uncertaintyUs: 400 });
const glitching = syntheticPulsar({
  name: 'KR 2210-05',
  epochMjd: START,
  glitches: [{ mjd: YESTERDAY - 21.4, deltaNuOverNu: 3e-8 }],
});
const young = syntheticPulsar({ name: 'KR 1733+15', epochMjd: START });
const span = { fromMjd: START + 1, toMjd: YESTERDAY, everyDays: 4 };

let at: TestObservatory;

const printed = async (...args: string[]) => (await runSpinvigil([...args, '--config', at.configFile])).stdout;
const limitsJson = () => spinvigilJson<LimitLine[]>(['limits', '--config', at.configFile]);
const planOf = (pulsar: string) => spinvigilJson<Plan>(['plan', pulsar, '--config', at.configFile]);

beforeAll(async () => {
  at = await createObservatory({ pulsars: [quiet, coarse, glitching, young] });
  const arrivals = [quiet, coarse, glitching].map((pulsar, seed) => syntheticArrivals(pulsar, { ...span, seed }));
  arrivals.push(syntheticArrivals(young, { ...span, fromMjd: YESTERDAY - 12, seed: 9 }));
  for (const [i, some] of arrivals.entries()) await at.drop(`${i}.csv`, arrivalFile(some));
  const files = arrivals.map((_, i) => join(at.feedFolder, `${i}.csv`));
  await printed('replay', ...files);
}, 120_000);
afterAll(() => at.remove());

describe('limits', () => {
  test('lists every pulsar, the blindest first, and those without a limit with the reason', async () => {
    const lines = await limitsJson();
    expect(lines.map((line) => line.pulsar).sort()).toEqual(['KR 0417+31', 'KR 1021-05', 'KR 1733+15', 'KR 2210-05']);
    const [unsettled, ...known] = lines;
    expect(unsettled).toMatchObject({ pulsar: 'KR 1733+15', deltaNuOverNu90: null, delayDays90: null });
    expect(unsettled!.reason).toContain('not settled');
    const sizes = known.map((line) => line.deltaNuOverNu90!);
    expect(sizes).toEqual([...sizes].sort((a, b) => b - a));
    expect(known[0]!.pulsar).toBe('KR 1021-05');
    for (const { arrivals, noise, lastArrivalMjd, delayDays90 } of known) {
      expect(arrivals).toBe(50);
      expect(noise).toHaveProperty('torqueWalk');
      expect(lastArrivalMjd!).toBeGreaterThan(YESTERDAY - 5);
      expect(delayDays90!).toBeGreaterThan(0);
    }
  });

  test('as text states units and the meaning', async () => {
    const text = await printed('limits', '--pulsar', 'KR 0417+31');
    expect(text).toContain('smallest Δν/ν');
    expect(text).toContain('after (d)');
    expect(text).toContain('90 %');
    expect(text).not.toContain('KR 1021-05');
  });

  test('of a pulsar that is not known says so', async () => {
    const { code, stderr } = await runSpinvigil(['limits', '--pulsar', 'KR 0417+3', '--config', at.configFile]);
    expect(code).toBe(2);
    expect(stderr).toContain('did you mean KR 0417+31?');
  });

  test('are worked out where an older record holds none', async () => {
    const before = await limitsJson();
    const { configuration } = loadOrders(at.configFile);
    const store = openRecord(configuration, 'daemon');
    try {
      const { limit: _, arrivals: __, ...report } = store.pulsarReport('KR 0417+31')!;
      store.commitIntake({ ...emptyBatch(systemClock.now().toISOString()), reports: [report] });
    } finally {
      store.close();
    }
    expect(await limitsJson()).toEqual(before);
  });

  test('stand in the morning review, the blindest first', () => {
    const { configuration } = loadOrders(at.configFile);
    const store = openRecord(configuration, 'reader');
    try {
      const review = morningReview({ configuration, store, clock: systemClock, warnings: [] });
      expect(review.limits[0]!.pulsar).toBe('KR 1021-05');
      expect(review.limits.map((l) => l.pulsar)).not.toContain('KR 1733+15');
      const text = digestText(review, {
        observatory: configuration.observatory,
        timezone: configuration.mail.timezone,
        reviewUrl: null,
      });
      expect(text).toContain('The blindest first:');
      expect(text.replace(/\s+/g, ' ')).toMatch(/KR 1021-05: Δν\/ν = .* or more, within .* d/);
    } finally {
      store.close();
    }
  });
});

describe('plan', () => {
  test('of a quiet pulsar says until when its count is safe, and what other cadences would show', async () => {
    const made = await planOf('KR 0417+31');
    expect(made).toMatchObject({ pulsar: 'KR 0417+31', locked: true, aliases: null, suspicion: null, recovery: null });
    expect(made.count!.safeUntilMjd!).toBeGreaterThan(YESTERDAY);
    expect(made.cadences).toHaveLength(5);
    const text = await printed('plan', 'KR 0417+31');
    expect(text).toContain('cannot be numbered without doubt');
    expect(text).toContain('every 14 d');
  });

  test('after a glitch says which nights pin the recovery, from tomorrow on', async () => {
    const { recovery } = await planOf('KR 2210-05');
    expect(recovery!.schedules.map((s) => s.name)).toContain('front-loaded');
    expect(recovery!.nights[0]!.mjd).toBeGreaterThan(YESTERDAY);
    const text = await printed('plan', 'KR 2210-05');
    expect(text).toContain('To pin the recovery of');
    expect(text).toContain('front-loaded');
  });

  test('is kept with the decision, as of the last arrival, for the page of the event', () => {
    const { configuration } = loadOrders(at.configFile);
    const store = openRecord(configuration, 'reader');
    try {
      const [{ event } = { event: null }] = store.events({ pulsar: 'KR 2210-05' });
      const { plan, lastArrivalMjd } = store.pulsarReport('KR 2210-05')!;
      expect(plan!.asOfMjd).toBe(lastArrivalMjd);
      expect(planOfEvent(plan!, event!.id, 'UTC')[0]!.says).toContain('To pin the recovery of');
      expect(store.pulsarReport('KR 0417+31')).not.toHaveProperty('plan');
    } finally {
      store.close();
    }
  });

  test('of a pulsar whose count is open asks for what settles it, and states no limit', async () => {
    const made = await planOf('KR 1733+15');
    expect(made).toMatchObject({ locked: false, cadences: [] });
    const text = await printed('plan', 'KR 1733+15');
    expect(text).toContain('pulse count is not settled');
  });
});

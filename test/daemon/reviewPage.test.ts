import { type AddressInfo, createServer } from 'node:net';
import { expect, test } from 'vitest';
import { createStoreDesk } from '../../daemon/review/storeDesk.ts';
import { createVerdictTokens } from '../../daemon/review/verdictToken.ts';
import { openReviewPage } from '../../daemon/reviewPage.ts';
import { createTestStation } from '../support/station.ts';
import { syntheticPulsar } from '../support/syntheticPulsar.ts';

test('E15: a port that is taken does not keep the daemon from starting', async () => {
  const other = createServer();
  await new Promise<void>((resolve) => other.listen(0, '127.0.0.1', resolve));
  const { port } = other.address() as AddressInfo;
  const at = await createTestStation({
    pulsars: [syntheticPulsar({ name: 'KR 1', epochMjd: 61_000 })],
    now: '2026-06-01T08:00:00.000Z',
  });
  try {
    const { configuration, store, clock } = at.station;
    const station = { ...at.station, configuration: { ...configuration, review: { ...configuration.review, port } } };
    const health = () => ({ ok: true, problems: [] });
    const unasked = () => {
      throw new Error('nobody asked');
    };
    const asked = { morning: unasked, vitalSigns: unasked, metrics: unasked, health };
    const desk = createStoreDesk({ configuration, store, clock, ...asked });
    const page = await openReviewPage(station, { desk, tokens: createVerdictTokens() });
    expect(page.url()).toBeNull();
    await page.close();
  } finally {
    await at.close();
    await new Promise((resolve) => other.close(resolve));
  }
});

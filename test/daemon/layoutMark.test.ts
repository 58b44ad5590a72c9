import { afterAll, expect, test } from 'vitest';
import type { Configuration } from '../../daemon/config/configuration.ts';
import { configuredColumns } from '../support/feedLayout.ts';
import { createTestStation } from '../support/station.ts';
import { syntheticPulsar } from '../support/syntheticPulsar.ts';

const pulsar = syntheticPulsar({ name: 'KR 0417+31', epochMjd: 61_000 });
const at = await createTestStation({ pulsars: [pulsar], now: '2026-06-01T00:00:00Z' });
afterAll(() => at.close());

const TABLE = `separator = "blanks"
time = { column = 2, format = "mjd" }
uncertainty = { column = 3, unit = "us" }
frequency = { column = 4, unit = "MHz" }
pulsar = { column = 1, names = { A = "KR 0417+31" } }
site = { fixed = "barycentre" }
`.replace('format = "mjd"', 'format = "mjd", scale = "TDB"');

function described(table: string): Configuration {
  const { columns } = configuredColumns(table);
  const { configuration } = at.station;
  return { ...configuration, feeds: configuration.feeds.map((feed) => ({ ...feed, layout: 'columns', columns })) };
}

test('a feed that is described anew has its files read anew, and only then', async () => {
  const text = 'A 61001.25 2 1400\n';
  const uncertainties = () =>
    at.store.arrivals(pulsar.name).map(({ uncertaintyUs, status }) => [uncertaintyUs, status]);
  // As CSV it cannot be read; the feed's real layout is set, then its unit corrected.
  expect(await at.deliver('a.txt', text)).toMatchObject({ kind: 'quarantined whole' });
  const first = at.restart(described(TABLE));
  expect(await first.deliver('a.txt', text)).toMatchObject({ kind: 'taken in', newArrivals: 1 });
  expect(await first.deliver('a.txt', text)).toMatchObject({ kind: 'known' });
  expect(await at.restart(described(TABLE)).deliver('a.txt', text)).toMatchObject({ kind: 'known' });
  expect(uncertainties()).toEqual([[2, 'live']]);
  const corrected = at.restart(described(TABLE.replace('unit = "us"', 'unit = "ms"')));
  expect(await corrected.deliver('a.txt', text)).toMatchObject({ kind: 'taken in', newArrivals: 1 });
  expect(uncertainties().filter(([, status]) => status === 'live')).toEqual([[2000, 'live']]);
});

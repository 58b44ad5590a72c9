import { spawnSync } from 'node:child_process';
import { describe, expect, test } from 'vitest';
import { type Family, openMetricsText } from '../../../daemon/metrics/openMetrics.ts';
import { watchMetrics } from '../../../daemon/metrics/watchMetrics.ts';
import { createProgress } from '../../../daemon/progress.ts';
import { loadTables } from '../../../daemon/tables/loadTables.ts';
import { vitalSigns } from '../../../daemon/vitalSigns.ts';
import { createTestStation } from '../../support/station.ts';
import { arrivalFile, syntheticArrivals, syntheticPulsar } from '../../support/syntheticPulsar.ts';

const PYTHON = '/usr/bin/python3';
const PARSER = `import json, sys
from prometheus_client.openmetrics.parser import text_string_to_metric_families
text = sys.stdin.buffer.read().decode('utf-8')
print(json.dumps([[m.name, m.type, m.unit, m.documentation, [[s.name, s.labels, s.value] for s in m.samples]]
                  for m in text_string_to_metric_families(text)]))`;
const hasParser = spawnSync(PYTHON, ['-c', 'import prometheus_client.openmetrics.parser']).status === 0;
if (!hasParser)
  console.warn('SKIPPED: python3-prometheus-client is not installed, so that no reader of others reads our metrics');

type Read = [
  name: string,
  type: string,
  unit: string,
  help: string,
  samples: [string, Record<string, string>, number][],
];

/** As Debian's python3-prometheus-client reads OpenMetrics; it refuses what the specification forbids. */
function readByOthers(text: string): Read[] {
  const read = spawnSync(PYTHON, ['-c', PARSER], { input: text, encoding: 'utf8' });
  if (read.status !== 0) throw new Error(read.stderr);
  return JSON.parse(read.stdout) as Read[];
}

const FAMILIES: Family[] = [
  { name: 'a_build', type: 'info', help: 'Versions.', samples: [{ labels: { node: '20' }, value: 1 }] },
  {
    name: 'a_age_seconds',
    type: 'gauge',
    unit: 'seconds',
    help: 'Two lines\nand a \\ and "quotes".',
    samples: [
      { labels: { feed: 'north "dish"\n\\ ν̇' }, value: 1.5e-7 },
      { labels: { feed: 'south' }, value: -0.25 },
    ],
  },
  { name: 'a_files', type: 'counter', help: 'Files.', samples: [{ value: 123_456_789 }] },
  { name: 'a_empty', type: 'gauge', help: 'Nothing.', samples: [] },
];

describe('OpenMetrics', () => {
  test('is written as the specification has it', () => {
    expect(openMetricsText(FAMILIES)).toBe(`# TYPE a_build info
# HELP a_build Versions.
a_build_info{node="20"} 1
# TYPE a_age_seconds gauge
# UNIT a_age_seconds seconds
# HELP a_age_seconds Two lines\\nand a \\\\ and "quotes".
a_age_seconds{feed="north \\"dish\\"\\n\\\\ ν̇"} 1.5e-7
a_age_seconds{feed="south"} -0.25
# TYPE a_files counter
# HELP a_files Files.
a_files_total 123456789
# EOF
`);
    expect(openMetricsText([])).toBe('# EOF\n');
  });

  test.skipIf(!hasParser)('is read back by a reader of others', () => {
    expect(readByOthers(openMetricsText(FAMILIES))).toEqual([
      ['a_build', 'info', '', 'Versions.', [['a_build_info', { node: '20' }, 1]]],
      [
        'a_age_seconds',
        'gauge',
        'seconds',
        'Two lines\nand a \\ and "quotes".',
        [
          ['a_age_seconds', { feed: 'north "dish"\n\\ ν̇' }, 1.5e-7],
          ['a_age_seconds', { feed: 'south' }, -0.25],
        ],
      ],
      ['a_files', 'counter', '', 'Files.', [['a_files_total', {}, 123_456_789]]],
    ]);
  });
});

test.skipIf(!hasParser)('what the watch says of itself can be read by others, and is true', async () => {
  const pulsar = syntheticPulsar({ name: 'KR 0417+31', epochMjd: 61_000 });
  const at = await createTestStation({ pulsars: [pulsar], now: '2026-04-22T08:30:00.000Z' });
  try {
    const arrivals = syntheticArrivals(pulsar, { fromMjd: 61_000, toMjd: 61_040, everyDays: 2, seed: 3 });
    await at.deliver('a.csv', `${arrivalFile(arrivals)}KR 0417+31,not a date,1,1400,ridge\n`);
    const { configuration, store, clock } = at.station;
    const progress = createProgress(clock);
    progress.stage('mail', 1000);
    at.setNow('2026-04-22T09:30:01.000Z');
    const startedAt = new Date('2026-04-22T08:00:00.000Z');
    const sources = { configuration, store, clock, progress, intake: null, delivery: null };
    const signs = () => vitalSigns({ ...sources, sky: loadTables(), startedAt, heartbeats: () => [] });
    const read = readByOthers(watchMetrics({ ...sources, vitalSigns: signs, droppedLogLines: () => 2 }));
    expect(read.every(([name]) => name.startsWith('spinvigil_'))).toBe(true);
    const value = (name: string, label?: string) =>
      read
        .flatMap(([, , , , samples]) => samples)
        .find(([n, labels]) => n === name && (label === undefined || Object.values(labels).includes(label)))?.[2];
    expect(value('spinvigil_feed_last_file_age_seconds', 'nightly')).toBe(3600);
    expect(value('spinvigil_files_total')).toBe(1);
    expect(value('spinvigil_arrivals_total')).toBe(arrivals.length);
    expect(value('spinvigil_quarantined_rows_total')).toBe(1);
    expect(value('spinvigil_events', 'confirmed')).toBe(0);
    expect(value('spinvigil_pulsars')).toBe(1);
    expect(value('spinvigil_stage_late', 'mail')).toBe(1);
    expect(value('spinvigil_uptime_seconds')).toBe(5401);
    expect(value('spinvigil_log_lines_dropped_total')).toBe(2);
    // 2027-06-28 as the IERS's list of leap seconds shipped with the program expires.
    expect(value('spinvigil_table_end_seconds', 'leap seconds')).toBe(Date.parse('2027-06-28T00:00:00Z') / 1000);
    expect(value('spinvigil_record_size_bytes')).toBeGreaterThan(4096);
  } finally {
    await at.close();
  }
});

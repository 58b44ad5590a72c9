/**
 * The whole program on real arrival times: 78 pulsars of the first open release of the UTMOST timing programme (Lower et
 * al. 2020, MNRAS 494, 228; MIT licence, test/data/molonglo/LICENSE), held to the glitches its owners published.
 */
import { mkdtempSync, readdirSync, readFileSync, realpathSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import type { PulsarEvent } from '../../detectors/index.ts';
import { ROOT } from '../support/sourceTree.ts';
import { runInstalled, spinvigilJson } from '../support/spinvigil.ts';

const ARCHIVE = join(ROOT, 'test', 'data', 'molonglo');
const DAYS_PER_YEAR = 365.25;

interface Truth {
  readonly first: number;
  readonly last: number;
  /** `usable`: enough arrivals on both sides for a size; `gap`: days without arrivals around the epoch. */
  readonly glitches: readonly {
    readonly epoch: number;
    readonly size: number;
    readonly gap: number;
    readonly usable: boolean;
  }[];
}
const truth: Record<string, Truth> = JSON.parse(readFileSync(join(ARCHIVE, 'truth.json'), 'utf8'));

describe('a replay of the archive', () => {
  const folder = mkdtempSync(join(realpathSync(tmpdir()), 'spinvigil-archive-'));
  const config = join(folder, 'spinvigil.toml');
  let events: PulsarEvent[] = [];

  beforeAll(async () => {
    writeFileSync(config, configuration(folder));
    const arrivals = join(ARCHIVE, 'arrivals');
    const files = readdirSync(arrivals).map((name) => join(arrivals, name));
    const began = performance.now();
    const { code, stderr } = await runInstalled(['replay', '--config', config, ...files]);
    expect(code, stderr).toBe(0);
    console.log(`replay of ${files.length} pulsars: ${((performance.now() - began) / 1000).toFixed(1)} s`);
    events = await spinvigilJson<PulsarEvent[]>(['events', '--config', config]);
  }, 240_000);
  afterAll(() => rmSync(folder, { recursive: true, force: true }));

  const published = Object.entries(truth).flatMap(([pulsar, { glitches }]) =>
    glitches.map((glitch) => ({ pulsar, ...glitch })),
  );

  test.each(published)('finds the glitch of $pulsar at MJD $epoch', ({ pulsar, epoch, size, gap, usable }) => {
    const found = events.filter((e) => e.pulsar === pulsar && e.state === 'confirmed');
    expect(found).toHaveLength(1);
    const [event] = found;
    console.log(
      `${pulsar}: published ${size} at ${epoch}; found ${event!.deltaNuOverNu} ` +
        `[${event!.deltaNuOverNuInterval68?.join(', ')}] at ${event!.epochMjd} [${event!.epochInterval95.join(', ')}]`,
    );
    expect(event!.explanation).toBe('glitch');
    expect(Math.abs(event!.epochMjd - epoch)).toBeLessThan(gap + 10);
    if (usable) expect(Math.abs(event!.deltaNuOverNu! / size - 1)).toBeLessThan(0.05);
  });

  test('is silent on the quiet pulsars', () => {
    const quiet = new Set(Object.keys(truth).filter((pulsar) => truth[pulsar]!.glitches.length === 0));
    const years = [...quiet].reduce((sum, p) => sum + (truth[p]!.last - truth[p]!.first) / DAYS_PER_YEAR, 0);
    const found = events.filter((e) => quiet.has(e.pulsar) && e.explanation !== 'bad session');
    const count = (state: string) => found.filter((e) => e.state === state).length;
    console.log(
      `${quiet.size} quiet pulsars, ${years.toFixed(0)} pulsar-years: ${count('confirmed')} confirmed, ` +
        `${count('suspected')} still suspected, ${count('withdrawn')} withdrawn events`,
    );
    expect(years).toBeGreaterThan(200);
    expect(count('confirmed')).toBe(0);
  });
});

function configuration(folder: string): string {
  return `
[observatory]
name = "Archive"
contact = "duty@example.org"
[state]
folder = "${join(folder, 'state')}"
[[site]]
name = "molonglo"
itrf_m = [-4483311.64, 2648815.92, -3671909.31]
clock_table = "${join(ARCHIVE, 'clock', 'molonglo.csv')}"
[[feed]]
name = "archive"
folder = "${join(ARCHIVE, 'arrivals')}"
layout = "csv"
[models]
folder = "${join(ARCHIVE, 'models')}"
[budget]
false_alerts_per_year = 1.0
[mail]
transport = "folder"
folder = "${join(folder, 'mail')}"
from = "spinvigil@example.org"
to = ["duty@example.org"]
timezone = "UTC"
digest_cron = "0 8 * * *"
[review]
listen = "127.0.0.1:0"
`;
}

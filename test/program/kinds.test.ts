import { cpSync, mkdtempSync, readdirSync, readFileSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import type { PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import type { ExpectedOfKinds } from '../../sample-feeds/kinds/expected.ts';
import { filesOfKinds } from '../../sample-feeds/kinds/generate.ts';
import { sameButForTheLastDigit } from '../support/madeFiles.ts';
import { ROOT } from '../support/sourceTree.ts';
import { runInstalled, spinvigilJson } from '../support/spinvigil.ts';

// The five kinds of neutron star, from files to decisions.

const KINDS = join(ROOT, 'sample-feeds', 'kinds');
const expected: ExpectedOfKinds = JSON.parse(readFileSync(join(KINDS, 'expected.json'), 'utf8'));
const FEEDS = ['radio', 'x-ray'];

test('the committed files are what the generator makes', () => {
  const made = filesOfKinds();
  const committed = ['models', 'clock', ...FEEDS].flatMap((folder) =>
    readdirSync(join(KINDS, folder)).map((name) => `${folder}/${name}`),
  );
  expect(made.map(({ path }) => path).sort()).toEqual([...committed, 'expected.json'].sort());
  const different = made.filter(
    ({ path, content }) => !sameButForTheLastDigit(content, readFileSync(join(KINDS, path), 'utf8')),
  );
  expect(different.map(({ path }) => path)).toEqual([]);
});

interface ArrivalLine {
  readonly barycentreTdbMjd: string;
  readonly delays: { readonly orbitS: number };
  readonly pulseNumber: number;
  readonly fate: string;
  readonly reason: string;
}

describe('a replay of the five kinds', () => {
  const folder = mkdtempSync(join(tmpdir(), 'spinvigil-kinds-'));
  const kinds = join(folder, 'sample-feeds', 'kinds');
  const config = join(kinds, 'spinvigil.toml');
  const arrivals = new Map<string, ArrivalLine[]>();
  let events: PulsarEvent[] = [];

  beforeAll(async () => {
    cpSync(KINDS, kinds, { recursive: true });
    const files = FEEDS.flatMap((feed) => readdirSync(join(kinds, feed)).map((name) => join(kinds, feed, name)));
    const began = performance.now();
    const replay = await runInstalled(['replay', ...files, '--config', config]);
    expect(replay.code, replay.stderr).toBe(0);
    console.log(`replay of the five kinds: ${((performance.now() - began) / 1000).toFixed(1)} s`);
    events = await spinvigilJson<PulsarEvent[]>(['events', '--config', config]);
    const ofPulsar = async ({ pulsar }: { readonly pulsar: string }) =>
      arrivals.set(pulsar, await spinvigilJson<ArrivalLine[]>(['arrivals', pulsar, '--config', config]));
    await Promise.all(expected.pulsars.map(ofPulsar));
  }, 120_000);
  afterAll(() => rmSync(folder, { recursive: true, force: true }));

  test.each(expected.pulsars)('decides rightly on $pulsar ($kind)', ({ pulsar }) => {
    const found = events.filter((event) => event.pulsar === pulsar && event.state === 'confirmed');
    const planted = expected.glitches.filter((glitch) => glitch.pulsar === pulsar);
    expect(found.map(({ explanation }) => explanation)).toEqual(planted.map(({ explanation }) => explanation));
    planted.forEach((glitch, i) => {
      const { epochMjd, deltaNuOverNu } = found[i]!;
      expect(Math.abs(epochMjd - glitch.epochMjd)).toBeLessThanOrEqual(glitch.epochWithinDays);
      expect(Math.abs(deltaNuOverNu! / glitch.deltaNuOverNu - 1)).toBeLessThanOrEqual(glitch.sizeWithin);
    });
  });

  test.each(expected.pulsars)('uses every arrival of $pulsar, once it is followed', ({ pulsar }) => {
    const fates = arrivals.get(pulsar)!.map(({ fate, reason }) => `${fate}: ${reason}`);
    expect(new Set(fates)).toEqual(new Set(['used: agrees with the rotation as followed']));
  });

  test('takes an orbit off the times of those that have a companion, and of no other', () => {
    const bound = ({ kind }: { kind: string }) => kind === 'millisecond binary' || kind === 'accreting';
    for (const pulsar of expected.pulsars) {
      const delays = arrivals.get(pulsar.pulsar)!.map(({ delays }) => Math.abs(delays.orbitS));
      expect(Math.max(...delays) > 1).toBe(bound(pulsar));
    }
  });

  /** Mean period (s) from the first to the last of some arrivals, as the pulsar turns, by counting pulses. */
  function meanPeriod(some: readonly ArrivalLine[]): number {
    const [first, last] = [some[0]!, some.at(-1)!];
    const [a, b] = [first, last].map(({ barycentreTdbMjd }) => barycentreTdbMjd.split('.'));
    const days = Number(b![0]) - Number(a![0]) + (Number(`0.${b![1]}`) - Number(`0.${a![1]}`));
    const seconds = days * 86_400 - (last.delays.orbitS - first.delays.orbitS);
    return seconds / (last.pulseNumber - first.pulseNumber);
  }

  // Facts of the trade (common practice, no source), read off the counted pulses alone.

  test.each(expected.pulsars)('finds that $pulsar ($kind) slows down unless it accretes', ({ pulsar, kind }) => {
    const glitch = expected.glitches.find((g) => g.pulsar === pulsar);
    const steady = arrivals
      .get(pulsar)!
      .filter(({ barycentreTdbMjd }) => glitch === undefined || Number(barycentreTdbMjd) < glitch.epochMjd);
    const third = Math.floor(steady.length / 3);
    const change = meanPeriod(steady.slice(-third)) / meanPeriod(steady.slice(0, third)) - 1;
    if (kind === 'accreting') expect(change).toBeLessThan(0);
    else expect(change).toBeGreaterThan(0);
  });

  test.each(expected.glitches)('finds that the period of $pulsar steps by the size of its glitch', (glitch) => {
    const lines = arrivals.get(glitch.pulsar)!;
    const after = lines.findIndex(({ barycentreTdbMjd }) => Number(barycentreTdbMjd) > glitch.epochMjd);
    const [earlier, before, behind] = [-10, -5, 0].map((i) => meanPeriod(lines.slice(after + i, after + i + 5)));
    // What the spin-down does from five arrivals to the next five is taken off.
    const step = behind! / before! - before! / earlier!;
    expect(Math.abs(-step / glitch.deltaNuOverNu - 1)).toBeLessThan(0.25);
  });
});

import { type ChildProcess, spawn } from 'node:child_process';
import { once } from 'node:events';
import { mkdtempSync, readdirSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { setTimeout as pause } from 'node:timers/promises';
import { afterAll, expect, test } from 'vitest';
import type { MorningReview } from '../../alerts/morningReview.ts';
import type { PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import { ROOT } from '../support/sourceTree.ts';
import { spinvigilJson } from '../support/spinvigil.ts';

// What `npm start` runs, in a folder of its own and at a faster pace.

const folder = join(mkdtempSync(join(tmpdir(), 'spinvigil-demo-')), 'run');
const config = join(folder, 'spinvigil.toml');
const started: ChildProcess[] = [];

afterAll(() => {
  for (const child of started) child.kill('SIGTERM');
  rmSync(join(folder, '..'), { recursive: true, force: true });
});

interface Demo {
  readonly child: ChildProcess;
  /** Waits for a line that matches; throws when the demo ends before. */
  sees(pattern: RegExp): Promise<RegExpExecArray>;
  /** Ctrl-C; resolves with the exit code. */
  stop(): Promise<number | null>;
  output(): string;
}

function startDemo(): Demo {
  const child = spawn(process.execPath, [
    join(ROOT, 'dist', 'daemon', 'demo.js'),
    ...['--folder', folder, '--seconds-a-night', '0.5'],
  ]);
  started.push(child);
  let output = '';
  for (const stream of [child.stdout, child.stderr]) stream.on('data', (chunk) => (output += chunk));
  const ended = once(child, 'exit');
  return {
    child,
    async sees(pattern) {
      for (;;) {
        const found = pattern.exec(output);
        if (found !== null) return found;
        if (child.exitCode !== null || child.signalCode !== null) throw new Error(`the demo ended:\n${output}`);
        await pause(100);
      }
    },
    async stop() {
      child.kill('SIGINT');
      const [code] = await ended;
      return code as number | null;
    },
    output: () => output,
  };
}

const confirmed = async (): Promise<PulsarEvent[]> =>
  (await spinvigilJson<PulsarEvent[]>(['events', '--config', config])).filter(({ state }) => state === 'confirmed');

test('a run that is broken off makes way for one that shows the events as they come', async () => {
  const first = startDemo();
  await first.sees(/Taking in/);
  expect(await first.stop(), first.output()).toBe(0);

  const demo = startDemo();
  const [, page] = await demo.sees(/review page\s+(http:\S+)/);
  expect((await fetch(page!)).status).toBe(200);
  expect(await confirmed()).toEqual([]);

  const rival = startDemo();
  await once(rival.child, 'exit');
  expect(rival.child.exitCode).toBe(3);
  expect(rival.output()).toContain('still running');

  await demo.sees(/mail: .*KR 0834-21/);
  expect((await confirmed()).map(({ pulsar }) => pulsar)).toContain('KR 0834-21');
  expect(await (await fetch(page!)).text()).toContain('KR 0834-21');
  expect(readdirSync(join(folder, 'mail')).every((name) => name.endsWith('.eml'))).toBe(true);

  await demo.sees(/All nights are in/);
  await demo.sees(/mail: .*KR 0529\+22/);
  await silenceOf('monitor');
  expect(await demo.stop(), demo.output()).toBe(0);
  expect(demo.output()).toContain('Stopped');
  await expect(fetch(page!)).rejects.toThrow();
}, 240_000);

/** Waits until the morning review names the feed, and no other, as silent. */
async function silenceOf(feed: string): Promise<void> {
  for (;;) {
    const { silentFeeds } = await spinvigilJson<MorningReview>(['morning', '--config', config]);
    if (silentFeeds.length > 0) {
      expect(silentFeeds.map((silent) => silent.feed)).toEqual([feed]);
      return;
    }
    await pause(1000);
  }
}

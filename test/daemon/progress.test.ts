import { afterEach, beforeEach, describe, expect, test, vi } from 'vitest';
import type { Pulse } from '../../daemon/health.ts';
import { silentLog } from '../../daemon/log.ts';
import { createProgress } from '../../daemon/progress.ts';
import type { Loop } from '../../daemon/schedule/loop.ts';
import { startWatchdog } from '../../daemon/watchdog.ts';

describe('progress', () => {
  test('a stage is late when it has something in hand and has not gone on for longer than its limit', () => {
    let nowMs = 0;
    const progress = createProgress({ monotonicMs: () => nowMs });
    const [feed, decide] = [progress.stage('feed', 1000), progress.stage('decide', 500)];
    decide.rest();
    nowMs = 900;
    expect(progress.late()).toEqual([]);
    nowMs = 1100;
    expect(progress.late()).toEqual(['feed']);
    feed.step();
    decide.step();
    nowMs = 1700;
    expect(progress.late()).toEqual(['decide']);
    expect(progress.stages()).toEqual([
      { name: 'feed', resting: false, sinceMs: 600, limitMs: 1000, late: false },
      { name: 'decide', resting: false, sinceMs: 600, limitMs: 500, late: true },
    ]);
  });
});

describe('the watchdog', () => {
  beforeEach(() => void vi.useFakeTimers());
  afterEach(() => void vi.useRealTimers());

  const HEALTHY: Pulse = { stopped: [], mailBlocked: false };

  function rig(watchdogMs: number | null = 1000) {
    const told: string[][] = [];
    const progress = createProgress({ monotonicMs: () => Date.now() });
    let pulse = HEALTHY;
    let loop: Loop | null = null;
    return {
      told,
      progress,
      setPulse: (next: Pulse) => {
        pulse = next;
      },
      start() {
        const manager = { watchdogMs, tell: async (...words: string[]) => void told.push(words) };
        const stopped = () => progress.late().map((stage) => `no progress: ${stage}`);
        loop = startWatchdog({
          manager,
          lateStages: progress.late,
          pulse: () => ({ ...pulse, stopped: [...pulse.stopped, ...stopped()] }),
          log: silentLog(),
        });
      },
      stop: async () => loop?.stop(),
    };
  }

  test('B12: one loop that is dead while the others live withholds the sign of life, and the status names it', async () => {
    const at = rig();
    const [feed, mail] = [at.progress.stage('feed nightly', 3000), at.progress.stage('mail', 5000)];
    at.start();
    for (let second = 0; second < 12; second++) {
      await vi.advanceTimersByTimeAsync(1000);
      if (second < 2) feed.step();
      mail.step();
    }
    await at.stop();
    const alive = at.told.map((words) => words.includes('WATCHDOG=1'));
    expect(alive.slice(0, 4)).toEqual([true, true, true, true]);
    expect(alive.slice(-5)).toEqual([false, false, false, false, false]);
    expect(at.told.at(-1)).toEqual(['STATUS=no progress: feed nightly']);
  });

  test('comes back when the stage does', async () => {
    const at = rig();
    const feed = at.progress.stage('feed nightly', 1500);
    at.start();
    await vi.advanceTimersByTimeAsync(4000);
    expect(at.told.at(-1)).toEqual(['STATUS=no progress: feed nightly']);
    feed.step();
    await vi.advanceTimersByTimeAsync(1000);
    expect(at.told.at(-1)).toEqual(['WATCHDOG=1', 'STATUS=watching']);
    await at.stop();
  });

  test('a full disk or blocked mail is said, but nobody is restarted for it', async () => {
    const at = rig();
    at.setPulse({ stopped: ['nothing can be written: no space'], mailBlocked: true });
    at.start();
    await vi.advanceTimersByTimeAsync(0);
    expect(at.told).toEqual([['WATCHDOG=1', 'STATUS=nothing can be written: no space; mail does not leave']]);
    await at.stop();
  });

  test('without a limit from systemd there is a status and no sign of life', async () => {
    const at = rig(null);
    at.start();
    await vi.advanceTimersByTimeAsync(61_000);
    expect(at.told).toEqual([['STATUS=watching'], ['STATUS=watching']]);
    await at.stop();
  });
});

import { afterEach, beforeEach, describe, expect, test, vi } from 'vitest';
import type { Clock } from '../../daemon/clock.ts';
import { silentLog } from '../../daemon/log.ts';
import { startDigestSchedule } from '../../daemon/schedule/digest.ts';
import { digestDue, digestRule } from '../../daemon/schedule/digestDue.ts';

// Clocks in Berlin go forward on 2026-03-29 (02:00 → 03:00) and back on 2026-10-25 (03:00 → 02:00), both at 01:00 UTC:
// Directive 2000/84/EC, articles 2 and 3 (last Sunday of March and of October).
const ZONE = 'Europe/Berlin';
const clock: Clock = { now: () => new Date(), monotonicMs: () => performance.now() };

describe('when a digest is due', () => {
  const due = (cron: string, at: string, made: readonly string[] = []) =>
    digestDue(digestRule(cron, ZONE), new Date(at), (date) => made.includes(date));

  test('from the stated time on, until it is made', () => {
    expect(due('0 8 * * *', '2026-06-10T05:59:59Z')).toBeNull();
    expect(due('0 8 * * *', '2026-06-10T06:00:00Z')).toBe('2026-06-10');
    expect(due('0 8 * * *', '2026-06-10T21:59:59Z')).toBe('2026-06-10');
    expect(due('0 8 * * *', '2026-06-10T06:00:00Z', ['2026-06-10'])).toBeNull();
  });

  test('never for a day gone by', () => expect(due('0 8 * * *', '2026-06-10T22:00:00Z')).toBeNull());

  test('on the days that the expression names', () => {
    expect(due('0 8 * * 1-5', '2026-06-12T10:00:00Z')).toBe('2026-06-12');
    expect(due('0 8 * * 1-5', '2026-06-13T10:00:00Z')).toBeNull();
    expect(due('0 8 1 * *', '2026-06-12T10:00:00Z')).toBeNull();
  });

  test('at a time that the spring change skips: at the first moment after the gap', () => {
    expect(due('30 2 * * *', '2026-03-29T00:59:59Z')).toBeNull();
    expect(due('30 2 * * *', '2026-03-29T01:00:00Z')).toBe('2026-03-29');
  });

  test('at a time that the autumn change repeats: once', () => {
    expect(due('30 2 * * *', '2026-10-25T00:30:00Z')).toBe('2026-10-25');
    expect(due('30 2 * * *', '2026-10-25T01:30:00Z', ['2026-10-25'])).toBeNull();
  });

  test('a cron expression that is none is named', () => {
    expect(() => digestRule('at eight', ZONE)).toThrow('“at eight” is not a cron expression');
  });
});

describe('the schedule on a fake clock', () => {
  beforeEach(() => void vi.useFakeTimers());
  afterEach(() => void vi.useRealTimers());

  /** Runs the real scheduler from one instant to another, restarting it at the given instants; returns the dates made. */
  async function run(cron: string, from: string, to: string, restarts: readonly string[] = []): Promise<string[]> {
    const made: string[] = [];
    const desk = {
      wasMade: (date: string) => made.includes(date),
      make: async (date: string) => void made.push(date),
    };
    vi.setSystemTime(new Date(from));
    for (const until of [...restarts, to]) {
      const schedule = startDigestSchedule({ cron, zone: ZONE, desk, clock, log: silentLog() });
      await schedule.catchUp();
      await vi.advanceTimersByTimeAsync(new Date(until).getTime() - Date.now());
      await schedule.stop();
    }
    return made;
  }

  test.each(['0 8 * * *', '30 2 * * *', '0 0 * * *', '59 23 * * *'])(
    'B9: %s: one a civil date over both changes',
    async (cron) => {
      expect(await run(cron, '2026-03-28T00:00:00Z', '2026-03-30T21:58:00Z')).toEqual(
        cron === '59 23 * * *' ? ['2026-03-28', '2026-03-29'] : ['2026-03-28', '2026-03-29', '2026-03-30'],
      );
      expect(await run(cron, '2026-10-23T22:00:00Z', '2026-10-26T22:58:00Z')).toEqual(
        cron === '59 23 * * *' ? ['2026-10-24', '2026-10-25'] : ['2026-10-24', '2026-10-25', '2026-10-26'],
      );
    },
  );

  test('B6: restarts neither repeat nor lose one', async () => {
    const restarts = ['2026-10-25T00:29:00Z', '2026-10-25T00:31:00Z', '2026-10-25T01:31:00Z', '2026-10-25T01:32:00Z'];
    expect(await run('30 2 * * *', '2026-10-24T12:00:00Z', '2026-10-25T12:00:00Z', restarts)).toEqual([
      '2026-10-24',
      '2026-10-25',
    ]);
  });

  test('a daemon that was down at the time makes it at its start', async () => {
    expect(await run('0 8 * * *', '2026-06-10T09:00:00Z', '2026-06-10T09:01:00Z')).toEqual(['2026-06-10']);
  });

  test('a digest that fails is tried again within five minutes', async () => {
    vi.setSystemTime(new Date('2026-06-10T05:59:00Z'));
    let attempts = 0;
    const made: string[] = [];
    const desk = {
      wasMade: (date: string) => made.includes(date),
      make: async (date: string) => {
        attempts += 1;
        if (attempts === 1) throw new Error('the disk is full');
        made.push(date);
      },
    };
    const schedule = startDigestSchedule({ cron: '0 8 * * *', zone: ZONE, desk, clock, log: silentLog() });
    await vi.advanceTimersByTimeAsync(7 * 60_000);
    await schedule.stop();
    expect(made).toEqual(['2026-06-10']);
    expect(attempts).toBe(2);
  });
});

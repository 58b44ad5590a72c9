import { afterEach, beforeEach, describe, expect, test, vi } from 'vitest';
import { type Backlog, createBacklog } from '../../daemon/backlog.ts';
import { systemClock } from '../../daemon/clock.ts';

const LAST = { isFresh: true, filesWaiting: 0 };
const FRESH = { isFresh: true, filesWaiting: 1000 };
const OLD = { isFresh: false, filesWaiting: 1000 };

let decided: string[];
let failures: unknown[];
let decidingTakesMs: number;
let backlog: Backlog;

beforeEach(() => {
  vi.useFakeTimers();
  decided = [];
  failures = [];
  decidingTakesMs = 0;
  backlog = createBacklog({
    async decide(pulsars) {
      await new Promise((resolve) => setTimeout(resolve, decidingTakesMs));
      decided.push(pulsars.join(' '));
    },
    onFailure: (error) => failures.push(error),
    clock: systemClock,
  });
});
afterEach(() => vi.useRealTimers());

const pass = (ms: number) => vi.advanceTimersByTimeAsync(ms);

describe('the backlog of decisions', () => {
  test('decides once when no file waits any more', async () => {
    for (const pulsar of ['B', 'A', 'B', 'C']) {
      backlog.add([pulsar], OLD);
      await pass(100);
    }
    expect(decided).toEqual([]);
    expect(backlog.isEmpty).toBe(false);
    backlog.add(['A'], LAST);
    await pass(1000);
    expect(decided).toEqual(['A B C']);
    expect(backlog.isEmpty).toBe(true);
    await pass(600_000);
    expect(decided).toHaveLength(1);
  });

  test('decides before, while files go on waiting, and sooner for fresh ones', async () => {
    for (let second = 0; second < 60; second++) {
      backlog.add(['old'], OLD);
      await pass(1000);
    }
    await pass(1);
    expect(decided).toEqual(['old']);
    backlog.add(['old'], OLD);
    backlog.add(['fresh'], FRESH);
    await pass(5001);
    expect(decided).toEqual(['old', 'fresh old']);
  });

  test('decides although the last file never came: refused, or gone', async () => {
    backlog.add(['A'], FRESH);
    await pass(5001);
    expect(decided).toEqual(['A']);
  });

  test('A33: leaves most of the time to the files, however long a decision takes', async () => {
    decidingTakesMs = 10_000;
    for (let second = 0; second < 600; second++) {
      backlog.add(['A'], FRESH);
      await pass(1000);
    }
    expect(decided.length).toBeGreaterThan(9);
    expect(decided.length * decidingTakesMs).toBeLessThan(0.25 * 600_000);
  });

  test('files that come in small pauses do not put a decision off for ever', async () => {
    for (let i = 0; i < 100; i++) {
      backlog.add(['A'], LAST);
      await pass(200);
    }
    expect(decided.length).toBeGreaterThan(1);
  });

  test('what comes in while it decides is decided next', async () => {
    decidingTakesMs = 1000;
    backlog.add(['A'], LAST);
    await pass(500);
    backlog.add(['B'], LAST);
    await pass(3000);
    expect(decided).toEqual(['A', 'B']);
  });

  test('a decision that failed stays open and is tried again', async () => {
    let broken = true;
    backlog = createBacklog({
      async decide(pulsars) {
        if (broken) throw new Error('the disk is full');
        decided.push(pulsars.join(' '));
      },
      onFailure: (error) => failures.push(error),
      clock: systemClock,
    });
    backlog.add(['A'], LAST);
    await pass(1000);
    expect(failures).toMatchObject([{ message: 'the disk is full' }]);
    expect(backlog.isEmpty).toBe(false);
    broken = false;
    await pass(60_000);
    expect(decided).toEqual(['A']);
  });

  test('stops without deciding, after the decision in hand', async () => {
    decidingTakesMs = 1000;
    backlog.add(['A'], LAST);
    await pass(500);
    backlog.add(['B'], LAST);
    let stopped = false;
    void backlog.stop().then(() => {
      stopped = true;
    });
    await pass(0);
    expect(stopped).toBe(false);
    await pass(10_000);
    expect(stopped).toBe(true);
    expect(decided).toEqual(['A']);
  });
});

import { existsSync, rmSync } from 'node:fs';
import { join } from 'node:path';
import Database from 'better-sqlite3';
import { afterAll, beforeAll, expect, test } from 'vitest';
import { restore, type Store } from '../../../daemon/store/index.ts';
import { bundle, type Ended, start } from './childProgram.ts';
import { oneNight } from './oneNight.ts';
import { AT, fileBatch, LATER, NEXT_DAY, notice, open, temporaryFolder } from './sample.ts';

// A fault is moved one step later each time until a run ends without meeting it, as SQLite's own tests do it
// (sqlite.org/testing.html, "I/O error testing" and "Crash testing").

const STEPS_AT_MOST = 80;
/** Some sixty starts of a process: minutes on a machine that is busy with other things. */
const PATIENCE_MS = 240_000;
const folder = temporaryFolder();
let program = '';

beforeAll(async () => {
  program = await bundle('crashScenario.ts', join(folder.path, 'bundle'));
});
afterAll(() => folder.remove());

const runWithKillAt = (state: string, n: number): Promise<Ended> =>
  start(program, [state], { SPINVIGIL_TEST_KILL_AT: String(n) }).ended;

test('B1, B2, C8: killed at any step, the record is whole, keeps what was acknowledged, and the work goes on', {
  timeout: PATIENCE_MS,
}, async () => {
  const unharmed = await runWithKillAt(join(folder.path, 'unharmed'), 0);
  expect(unharmed, unharmed.errors).toMatchObject({ code: 0, signal: null });
  expect(unharmed.lines.at(-1)).toBe('done');
  const expected = contentOf(join(folder.path, 'unharmed'));

  let next = 1;
  let killed = 0;
  const work = async (): Promise<void> => {
    while (next <= STEPS_AT_MOST) {
      const n = next++;
      if (await survives(n, expected)) killed += 1;
      else return;
    }
  };
  await Promise.all([work(), work()]);
  expect(next).toBeLessThan(STEPS_AT_MOST);
  expect(killed).toBeGreaterThan(30);
});

test('C12: a restore that is killed leaves the old record or the new one, and can be done again', {
  timeout: PATIENCE_MS,
}, async () => {
  const restoring = await bundle('restoreScenario.ts', join(folder.path, 'bundle'));
  let n = 0;
  for (let killed = true; killed; ) {
    n += 1;
    const state = join(folder.path, `restore-${n}`);
    const copy = join(folder.path, `copy-${n}.db`);
    const store = open(state);
    store.commitIntake(fileBatch(0, 2));
    store.commitNotice(notice(1), AT);
    await store.backup(copy);
    store.settle(store.claimDue(AT)!.id, { kind: 'delivered', at: LATER });
    store.commitIntake(fileBatch(2, 2, { path: 'night-2.csv' }));
    store.close();

    const run = await start(restoring, [copy, state], { SPINVIGIL_TEST_KILL_AT: String(n) }).ended;
    killed = run.signal === 'SIGKILL';
    if (!killed) expect(run.lines).toEqual(['restored']);
    const between = open(state);
    expect(between.verify()).toEqual([]);
    expect([2, 4]).toContain(between.arrivals('KR 0417+31').length);
    // Whichever record it is: the notice has left and does not leave again.
    expect(between.outbox()).toMatchObject([{ state: 'delivered' }]);
    between.close();

    expect(await restore(copy, state, NEXT_DAY)).toMatchObject({ ok: true });
    const after = open(state);
    expect(after.arrivals('KR 0417+31')).toHaveLength(2);
    expect(after.outbox()).toMatchObject([{ state: 'delivered' }]);
    expect(existsSync(join(state, 'restoring.db'))).toBe(false);
    after.close();
  }
  expect(n).toBeGreaterThan(4);
});

/** False: the run ended before its n-th step. */
async function survives(n: number, expected: unknown): Promise<boolean> {
  const state = join(folder.path, `state-${n}`);
  const runs = [await runWithKillAt(state, n)];
  const wasKilled = runs[0]!.signal === 'SIGKILL';
  expect(wasKilled || runs[0]!.code === 0, `step ${n}: ${runs[0]!.errors}`).toBe(true);
  // The recovery is killed as well, at a step that differs from case to case.
  if (wasKilled && n % 3 === 0) {
    runs.push(await runWithKillAt(state, 1 + (n % 7)));
    expect(runs[1]!.errors).toBe('');
  }
  checkAfter(state, runs, n);

  const lines: string[] = [];
  await oneNight(state, (what) => lines.push(what));
  expect(contentOf(state), `after a kill at step ${n}`).toEqual(expected);
  checkMail(state, [...runs.map((run) => run.lines), lines], n);
  rmSync(state, { recursive: true });
  return wasKilled;
}

/** Opened after the crash: every invariant holds, and what was acknowledged is there. */
function checkAfter(state: string, runs: readonly Ended[], n: number): void {
  const lines = runs.flatMap((run) => run.lines);
  if (existsSync(join(state, 'copy.db'))) {
    const copy = new Database(join(state, 'copy.db'), { readonly: true });
    expect(copy.pragma('integrity_check', { simple: true })).toBe('ok');
    copy.close();
  } else expect(lines).not.toContain('backup');

  const store = open(state);
  expect(store.verify(), `after a kill at step ${n}`).toEqual([]);
  const first = store.knownFile('nightly', 'night-1.csv');
  const second = store.knownFile('nightly', 'night-2.csv');
  if (lines.includes('first file')) expect(first).not.toBeNull();
  if (lines.includes('second file')) expect(second).not.toBeNull();
  // Nothing half: rows, event and mail are there exactly when their file is.
  expect(store.arrivals('KR 0417+31')).toHaveLength((first === null ? 0 : 3) + (second === null ? 0 : 2));
  expect(store.publishedEvents()).toHaveLength(second === null ? 0 : 1);
  expect(store.outbox({ kind: 'event' })).toHaveLength(second === null ? 0 : 2);
  expect(store.quarantinedSince('')).toHaveLength(second === null ? 0 : 1);
  if (lines.includes('verdict')) expect(store.event('KR0417-60003')?.event.state).toBe('accepted');
  if (lines.includes('digest')) expect(store.lastDigest()?.civilDate).toBe('2026-03-02');
  for (const row of store.outbox()) {
    const settled = lines.includes(`settled ${row.messageId} ${row.recipient}`);
    if (settled) expect(row.state).toBe('delivered');
    if (lines.includes(`accepted ${row.messageId} ${row.recipient}`) && row.state !== 'delivered') {
      expect(row).toMatchObject({ state: 'queued', possibleDuplicate: true });
    }
  }
  store.close();
}

/** What the mail server took: at most one more copy a crash, and a repeated copy was marked. */
function checkMail(state: string, runs: readonly (readonly string[])[], n: number): void {
  const store = open(state);
  const accepted = runs.flat().filter((line) => line.startsWith('accepted '));
  for (const row of store.outbox({ kind: 'event' })) {
    const copies = accepted.filter((line) => line === `accepted ${row.messageId} ${row.recipient}`).length;
    expect(copies, `step ${n}`).toBeGreaterThanOrEqual(1);
    expect(copies).toBeLessThanOrEqual(Math.min(row.attempts, runs.length));
    if (copies > 1) expect(row.possibleDuplicate).toBe(true);
  }
  store.close();
}

/** What must be the same however often the work was cut off. Attempts and marks of mail may differ. */
function contentOf(state: string): unknown {
  const store: Store = open(state);
  try {
    return {
      arrivals: store.arrivals('KR 0417+31'),
      files: ['night-1.csv', 'night-2.csv'].map((path) => store.knownFile('nightly', path)),
      quarantined: store.quarantinedSince(''),
      event: store.event('KR0417-60003'),
      report: store.pulsarReports(),
      mail: store.outbox().map(({ messageId, recipient, state: end }) => ({ messageId, recipient, end })),
      digest: store.lastDigest(),
      problems: store.verify(),
    };
  } finally {
    store.close();
  }
}

import { existsSync, mkdirSync, readdirSync, statSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import Database from 'better-sqlite3';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { openStore, restore } from '../../../daemon/store/index.ts';
import { emptyBatch } from '../../../daemon/store/shapes.ts';
import { AT, fileBatch, LATER, NEXT_DAY, notice, open, sampleMessage, temporaryFolder, upsert } from './sample.ts';

let folder: ReturnType<typeof temporaryFolder>;
let state = '';
let copy = '';
beforeEach(() => {
  folder = temporaryFolder();
  state = join(folder.path, 'state');
  copy = join(folder.path, 'copy.db');
});
afterEach(() => folder.remove());

describe('a backup', () => {
  test('C12: taken while files come in is whole, a single file, and stands at some commit', async () => {
    const store = open(state);
    for (let n = 0; n < 10; n += 1) store.commitIntake(fileBatch(100 * n, 100, { path: `${n}.csv` }));
    const running = store.backup(copy);
    for (let n = 10; n < 30; n += 1) {
      store.commitIntake(fileBatch(100 * n, 100, { path: `${n}.csv` }));
      await new Promise((resolve) => setImmediate(resolve));
    }
    await running;
    store.close();
    expect(readdirSync(folder.path).sort()).toEqual(['copy.db', 'state']);
    expect(statSync(copy).mode & 0o777).toBe(0o600);

    const db = new Database(copy, { readonly: true });
    expect(db.pragma('integrity_check', { simple: true })).toBe('ok');
    const arrivals = db.prepare('SELECT count(*) FROM arrivals').pluck().get() as number;
    expect(arrivals).toBe(100 * (db.prepare('SELECT count(*) FROM files').pluck().get() as number));
    expect(arrivals).toBeGreaterThanOrEqual(1000);
    db.close();
  });

  test('from a reader beside the daemon, over an older copy', async () => {
    const store = open(state);
    writeFileSync(copy, 'an older copy');
    store.commitIntake(fileBatch(0, 5));
    const reader = open(state, 'reader');
    await reader.backup(copy);
    reader.close();
    store.close();
    const db = new Database(copy, { readonly: true });
    expect(db.prepare('SELECT count(*) FROM arrivals').pluck().get()).toBe(5);
    db.close();
  });

  test('C6, C12: that cannot be made leaves the older copy and no remains', async () => {
    const store = open(state);
    await expect(store.backup(join(folder.path, 'no such folder', 'copy.db'))).rejects.toThrow();
    for (const own of ['record.db', 'record.db-wal', 'lock.db', '../state/record.db']) {
      await expect(store.backup(`${state}/${own}`)).rejects.toThrow(/record itself/);
    }
    mkdirSync(copy);
    await expect(store.backup(copy)).rejects.toThrow();
    expect(readdirSync(folder.path).sort()).toEqual(['copy.db', 'state']);
    store.close();
  });
});

describe('a restore', () => {
  test('into an empty folder brings everything back', async () => {
    const store = open(state);
    store.commitIntake({ ...fileBatch(0, 5), events: [upsert()] });
    await store.backup(copy);
    const arrivals = store.arrivals('KR 0417+31');
    store.close();
    const other = join(folder.path, 'other');
    expect(await restore(copy, other, AT)).toEqual({ ok: true, keptAside: null });
    const restored = open(other);
    expect(restored.arrivals('KR 0417+31')).toEqual(arrivals);
    expect(restored.event('KR0417-60003')).not.toBeNull();
    expect(restored.verify()).toEqual([]);
    restored.close();
  });

  test('C11: keeps the present record aside, and repeats no mail that left since', async () => {
    const store = open(state);
    store.commitIntake({ ...fileBatch(0, 1), events: [upsert()], messages: [sampleMessage()] });
    store.commitNotice(notice(1), AT);
    await store.backup(copy);
    // After the copy: one of three leaves, and so does one the copy does not know of.
    store.settle(store.claimDue(AT)!.id, { kind: 'delivered', at: LATER });
    store.commitNotice(notice(2, { dueAt: '2026-01-01T00:00:00Z' }), LATER);
    store.settle(store.claimDue(AT)!.id, { kind: 'delivered', at: LATER });
    store.commitIntake(fileBatch(1, 1, { path: 'night-2.csv' }));
    store.close();

    const outcome = await restore(copy, state, NEXT_DAY);
    expect(outcome).toEqual({ ok: true, keptAside: join(state, 'before-restore-20260302T060000000Z.db') });
    let restored = open(state);
    expect(restored.verify()).toEqual([]);
    expect(restored.knownFile('nightly', 'night-2.csv')).toBeNull();
    expect(restored.outbox().map(({ state: end, possibleDuplicate }) => [end, possibleDuplicate])).toEqual([
      ['delivered', false],
      ['queued', true],
      ['queued', true],
    ]);
    restored.commitNotice(notice(2), NEXT_DAY);
    expect(restored.outbox({ kind: 'notice' }).at(-1)).toMatchObject({ state: 'delivered', deliveredAt: LATER });
    restored.close();
    // The same Message-ID with other news: rather twice than never.
    await restore(copy, state, LATER);
    restored = open(state);
    restored.commitNotice(notice(2, { subject: 'other news' }), NEXT_DAY);
    expect(restored.outbox({ kind: 'notice' }).at(-1)).toMatchObject({ state: 'queued', possibleDuplicate: true });
    restored.close();

    const aside = new Database(join(state, 'before-restore-20260302T060000000Z.db'), { readonly: true });
    expect(aside.prepare('SELECT count(*) FROM arrivals').pluck().get()).toBe(2);
    aside.close();
  });

  test('replaces a record that is ruined, which is kept too', async () => {
    const store = open(state);
    store.commitIntake(fileBatch(0, 5));
    await store.backup(copy);
    store.close();
    writeFileSync(join(state, 'record.db'), 'ruined '.repeat(4000));
    expect(openStore(state, { mode: 'daemon' }).ok).toBe(false);
    const outcome = await restore(copy, state, AT);
    expect(outcome).toMatchObject({ ok: true });
    expect(existsSync(outcome.ok ? outcome.keptAside! : '')).toBe(true);
    const restored = open(state);
    expect(restored.arrivals('KR 0417+31')).toHaveLength(5);
    restored.close();
  });

  test('is refused while an instance runs, and of a copy that is not sound or not ours', async () => {
    const store = open(state);
    store.commitIntake(fileBatch(0, 300));
    await store.backup(copy);
    expect(await restore(copy, state, AT)).toMatchObject({ ok: false, failure: { kind: 'held by another instance' } });
    store.close();

    const foreign = join(folder.path, 'foreign.db');
    new Database(foreign).exec('CREATE TABLE t (x)').close();
    const text = join(folder.path, 'text.db');
    writeFileSync(text, 'not a database '.repeat(500));
    const newer = new Database(copy);
    newer.pragma('user_version = 99');
    newer.close();
    expect(await restore(foreign, state, AT)).toMatchObject({ ok: false, failure: { kind: 'damaged' } });
    expect(await restore(text, state, AT)).toMatchObject({ ok: false, failure: { kind: 'damaged' } });
    expect(await restore(join(state, 'record.db'), state, AT)).toMatchObject({
      ok: false,
      failure: { kind: 'damaged' },
    });
    expect(await restore(join(folder.path, 'none'), state, AT)).toMatchObject({
      ok: false,
      failure: { kind: 'damaged' },
    });
    expect(await restore(copy, state, AT)).toMatchObject({ ok: false, failure: { kind: 'newer schema' } });
    const same = open(state);
    expect(same.arrivals('KR 0417+31')).toHaveLength(300);
    same.commitIntake(emptyBatch(AT));
    same.close();
  });

  test('is seen by a command that has the record open', async () => {
    const store = open(state);
    store.commitIntake(fileBatch(0, 2));
    await store.backup(copy);
    store.commitIntake(fileBatch(2, 2, { path: 'night-2.csv' }));
    store.close();
    const reader = open(state, 'reader');
    expect(reader.arrivals('KR 0417+31')).toHaveLength(4);
    await restore(copy, state, AT);
    expect(reader.arrivals('KR 0417+31')).toHaveLength(2);
    expect(reader.verify()).toEqual([]);
    reader.close();
  });
});

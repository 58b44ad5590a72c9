import {
  chmodSync,
  closeSync,
  existsSync,
  mkdirSync,
  openSync,
  readdirSync,
  readFileSync,
  renameSync,
  rmSync,
  statSync,
  symlinkSync,
  writeFileSync,
  writeSync,
} from 'node:fs';
import { join } from 'node:path';
import Database from 'better-sqlite3';
import { afterAll, afterEach, beforeAll, beforeEach, describe, expect, test } from 'vitest';
import { openStore } from '../../../daemon/store/index.ts';
import { networkFileSystem } from '../../../daemon/store/stateFolder.ts';
import { bundle, start } from './childProgram.ts';
import { fileBatch, open, temporaryFolder } from './sample.ts';

let folder: ReturnType<typeof temporaryFolder>;
let state = '';
beforeEach(() => {
  folder = temporaryFolder();
  state = join(folder.path, 'state');
});
afterEach(() => folder.remove());

function failureOf(mode: 'daemon' | 'reader') {
  const opened = openStore(state, { mode });
  if (opened.ok) {
    opened.store.close();
    throw new Error('it opened');
  }
  return opened.failure;
}

describe('one instance', () => {
  const programs = temporaryFolder();
  let holder = '';
  beforeAll(async () => {
    holder = await bundle('lockHolder.ts', programs.path);
  });
  afterAll(() => programs.remove());

  test('B3: a second process is refused, a reader is not, and kill -9 frees the folder at once', async () => {
    const first = start(holder, [state]);
    await first.printed('held');
    expect(failureOf('daemon').kind).toBe('held by another instance');
    expect((await start(holder, [state]).ended.then(({ lines }) => lines))[0]).toBe('held by another instance');
    open(state, 'reader').close();
    expect(failureOf('daemon').kind).toBe('held by another instance');

    first.process.kill('SIGKILL');
    await first.ended;
    open(state).close();
  });

  test('the lock survives readers and backups of the same process', async () => {
    const store = open(state);
    await store.backup(join(folder.path, 'copy.db'));
    open(state, 'reader').close();
    expect((await start(holder, [state]).ended).lines).toEqual(['held by another instance']);
    store.close();
  });

  test('a second opening in the same process is refused too', () => {
    const store = open(state);
    expect(failureOf('daemon').kind).toBe('held by another instance');
    store.close();
    open(state).close();
  });
});

describe('the folder', () => {
  test('is made for the owner alone, and so are its files', () => {
    const store = open(state);
    store.commitIntake(fileBatch(0, 1));
    expect(statSync(state).mode & 0o777).toBe(0o700);
    for (const name of readdirSync(state)) expect(statSync(join(state, name)).mode & 0o777, name).toBe(0o600);
    store.close();
  });

  test('is refused when everybody may write to it', () => {
    mkdirSync(state);
    chmodSync(state, 0o777);
    expect(failureOf('daemon')).toMatchObject({ kind: 'unsafe folder', message: expect.stringContaining('chmod 700') });
    expect(readdirSync(state)).toEqual([]);
  });

  test('is refused when it is a file, or the record in it is a link or a folder', () => {
    writeFileSync(state, '');
    expect(failureOf('reader').kind).toBe('unsafe folder');
    rmSync(state);
    mkdirSync(state, { mode: 0o700 });
    symlinkSync('/dev/null', join(state, 'record.db'));
    expect(failureOf('daemon').kind).toBe('unsafe folder');
    rmSync(join(state, 'record.db'));
    mkdirSync(join(state, 'record.db'));
    expect(failureOf('daemon').kind).toBe('unsafe folder');
  });

  test('C14: network file systems are known by their number', () => {
    expect(networkFileSystem(0x6969)).toBe('NFS');
    expect(networkFileSystem(0xff534d42 | 0)).toBe('CIFS');
    expect(networkFileSystem(0xef53)).toBeNull();
  });
});

describe('a record that is not in order is refused and left as it is', () => {
  test('nothing there: a reader makes nothing', () => {
    expect(failureOf('reader').kind).toBe('nothing on record');
    expect(existsSync(state)).toBe(false);
    mkdirSync(state, { mode: 0o700 });
    expect(failureOf('reader').kind).toBe('nothing on record');
    writeFileSync(join(state, 'record.db'), '');
    expect(failureOf('reader').kind).toBe('nothing on record');
    // What a start leaves that was killed before its first statement.
    open(state).close();
  });

  test('C5: gone or emptied after it was made', () => {
    open(state).close();
    renameSync(join(state, 'record.db'), join(state, 'elsewhere.db'));
    expect(failureOf('daemon')).toMatchObject({
      kind: 'damaged',
      message: expect.stringContaining('spinvigil restore'),
    });
    writeFileSync(join(state, 'record.db'), '');
    expect(failureOf('daemon').kind).toBe('damaged');
    rmSync(join(state, 'record.db'));
    renameSync(join(state, 'elsewhere.db'), join(state, 'record.db'));
    open(state).close();
  });

  test.each(['text', 'another database'])('C5: %s in its place', (what) => {
    mkdirSync(state, { mode: 0o700 });
    const file = join(state, 'record.db');
    if (what === 'text') writeFileSync(file, 'not a database. '.repeat(400));
    else new Database(file).exec('CREATE TABLE t (x)').close();
    const before = readFileSync(file);
    expect(failureOf('daemon').kind).toBe('damaged');
    expect(readFileSync(file).equals(before)).toBe(true);
  });

  test('C9: of a newer schema', () => {
    open(state).close();
    const db = new Database(join(state, 'record.db'));
    db.pragma('user_version = 99');
    db.close();
    for (const mode of ['daemon', 'reader'] as const) {
      expect(failureOf(mode)).toMatchObject({ kind: 'newer schema', message: expect.stringContaining('99') });
    }
  });

  test.each([
    ['every tenth page', 10],
    ['one page, that no start would read but for the check', 1_000_000],
  ])('C3: with %s overwritten', (_, every) => {
    const store = open(state);
    store.commitIntake(fileBatch(0, 500));
    store.close();
    const lastPage = statSync(join(state, 'record.db')).size / 4096 - 1;
    const file = openSync(join(state, 'record.db'), 'r+');
    for (let page = lastPage; page > 4; page -= every) writeSync(file, Buffer.alloc(2048, 0xa5), 0, 2048, page * 4096);
    closeSync(file);
    expect(failureOf('daemon')).toMatchObject({
      kind: 'damaged',
      message: expect.stringContaining('Nothing was changed'),
    });
  });
});

test('C4: a record moved away under the running program is noticed', () => {
  const store = open(state);
  expect(store.isInPlace()).toBe(true);
  renameSync(join(state, 'record.db'), join(state, 'moved.db'));
  expect(store.isInPlace()).toBe(false);
  writeFileSync(join(state, 'record.db'), 'another file');
  expect(store.isInPlace()).toBe(false);
  store.close();
});

test('a reader cannot do what needs the lock', () => {
  open(state).close();
  const reader = open(state, 'reader');
  expect(() => reader.commitIntake(fileBatch(0, 1))).toThrow(/reader/);
  expect(() => reader.claimDue('2026-03-01T00:00:00Z')).toThrow(/reader/);
  reader.close();
});

import { spawn, spawnSync } from 'node:child_process';
import { existsSync, readFileSync } from 'node:fs';
import { createRequire } from 'node:module';
import { join } from 'node:path';
import Database from 'better-sqlite3';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { bundle, type Ended, start } from './childProgram.ts';
import { AT, fileBatch, LATER, NEXT_DAY, notice, open, temporaryFolder } from './sample.ts';

// What the system may do to the record: calls that fail, a disk without room, another process that holds the database.

const folder = temporaryFolder();
let night = '';
let holder = '';
beforeAll(async () => {
  night = await bundle('crashScenario.ts', join(folder.path, 'bundle'));
  holder = await bundle('lockHolder.ts', join(folder.path, 'bundle'));
});
afterAll(() => folder.remove());

function mayRun(command: string, args: readonly string[], what: string): boolean {
  const may = spawnSync(command, args, { timeout: 20_000 }).status === 0;
  if (!may) console.warn(`SKIPPED: ${command} cannot be used here, so that ${what} is not tried`);
  return may;
}

/** Under a command that does something to it. */
function startUnder(command: string, args: readonly string[], program: string, state: string): Promise<Ended> {
  const child = spawn(command, [...args, process.execPath, program, state]);
  let output = '';
  let errors = '';
  child.stdout.on('data', (part) => (output += part));
  child.stderr.on('data', (part) => (errors += part));
  return new Promise((resolve) =>
    child.on('close', (code, signal) => {
      resolve({ code, signal, errors, lines: output.split('\n').filter((line) => line !== '') });
    }),
  );
}

/** Whole, with all that was acknowledged; and the work goes on when the fault is over. */
async function checkAfter(state: string, { lines }: Ended): Promise<void> {
  if (existsSync(join(state, 'record.db')) || lines.includes('opened')) {
    const store = open(state);
    expect(store.verify()).toEqual([]);
    if (lines.includes('first file')) expect(store.knownFile('nightly', 'night-1.csv')).not.toBeNull();
    if (lines.includes('second file')) expect(store.knownFile('nightly', 'night-2.csv')).not.toBeNull();
    store.close();
  }
  expect((await start(night, [state]).ended).lines.at(-1)).toBe('done');
}

describe.skipIf(!mayRun('strace', ['-qq', '-o', '/dev/null', 'true'], 'a call that fails'))('a call that fails', () => {
  const failing = (calls: string, error: string, when: string) => [
    ...['-f', '-qq', '-o', '/dev/null', '-e', `trace=${calls}`],
    ...['-e', `inject=${calls}:error=${error}:when=${when}`],
  ];

  test.each([3, 6, 9])(
    'C7: fsync says EIO from call %i on: nothing more is acknowledged, nothing is lost',
    {
      timeout: 120_000,
    },
    async (from) => {
      const state = join(folder.path, `eio-${from}`);
      const run = await startUnder('strace', failing('fdatasync,fsync', 'EIO', `${from}+`), night, state);
      expect(run.code).not.toBe(0);
      expect(run.lines).not.toContain('done');
      await checkAfter(state, run);
    },
  );

  test('C15: nothing but SQLite opens the record, its log or its lock', { timeout: 120_000 }, async () => {
    const state = join(folder.path, 'opened');
    const trace = join(folder.path, 'opened.txt');
    const run = await startUnder('strace', ['-f', '-qq', '-o', trace, '-e', 'trace=open,openat,openat2'], night, state);
    expect(run.lines.at(-1), run.errors).toBe('done');
    const opened = readFileSync(trace, 'utf8')
      .split('\n')
      .filter((line) => /\/(record|lock)\.db/.test(line));
    expect(opened.length).toBeGreaterThan(2);
    // SQLite follows no link at the end of a path (os_unix.c); Node's own calls do not ask for that.
    expect(opened.filter((line) => !line.includes('O_NOFOLLOW'))).toEqual([]);
  });

  test.each([12, 25])(
    'A39: the disk is full from write %i on: a transaction is gone whole, and the work goes on later',
    {
      timeout: 120_000,
    },
    async (from) => {
      const state = join(folder.path, `full-${from}`);
      const run = await startUnder('strace', failing('pwrite64', 'ENOSPC', `${from}+`), night, state);
      expect(run.lines).not.toContain('done');
      await checkAfter(state, run);
    },
  );

  test('A40: the file system became read-only: a transaction is gone whole, and the work goes on later', {
    timeout: 120_000,
  }, async () => {
    const state = join(folder.path, 'read-only');
    const run = await startUnder('strace', failing('pwrite64', 'EROFS', '20+'), night, state);
    expect(run.lines).not.toContain('done');
    await checkAfter(state, run);
  });
});

describe.skipIf(!mayRun('unshare', ['--pid', '--mount', '--fork', 'true'], 'another namespace'))(
  'another namespace',
  () => {
    test('B4: an instance in a process and mount namespace of its own is refused too', {
      timeout: 60_000,
    }, async () => {
      const state = join(folder.path, 'namespaces');
      const first = start(holder, [state]);
      await first.printed('held');
      const second = await startUnder('unshare', ['--pid', '--mount', '--fork', '--kill-child'], holder, state);
      expect(second.lines).toEqual(['held by another instance']);
      first.process.kill('SIGKILL');
      await first.ended;
    });
  },
);

test('C1: an operator’s transaction is waited for, and then the work is done whole', { timeout: 60_000 }, async () => {
  const state = join(folder.path, 'held');
  const store = open(state);
  const other = spawn(process.execPath, ['-e', HOLD_FOR_A_SECOND, join(state, 'record.db')]);
  await new Promise((resolve) => other.stdout.once('data', resolve));
  store.commitIntake(fileBatch(0, 3));
  expect(store.arrivals('KR 0417+31')).toHaveLength(3);
  expect(store.verify()).toEqual([]);
  store.close();
});

const HOLD_FOR_A_SECOND = `
const Database = require(${JSON.stringify(createRequire(import.meta.url).resolve('better-sqlite3'))});
const db = new Database(process.argv[1]);
db.exec('BEGIN IMMEDIATE');
console.log('held');
setTimeout(() => db.exec('COMMIT'), 1000);`;

test('C2: a reader that stays in its transaction for long keeps no writer from writing', () => {
  const state = join(folder.path, 'long-reader');
  const store = open(state);
  store.commitIntake(fileBatch(0, 3));
  const reader = new Database(join(state, 'record.db'), { readonly: true });
  reader.exec('BEGIN');
  const seen = () => reader.prepare('SELECT count(*) AS n FROM arrivals').get();
  expect(seen()).toEqual({ n: 3 });
  for (let n = 1; n <= 20; n++) store.commitIntake(fileBatch(3 * n, 3, { path: `night-${n}.csv` }));
  expect(seen()).toEqual({ n: 3 });
  expect(store.arrivals('KR 0417+31')).toHaveLength(63);
  reader.close();
  store.close();
});

test('C17: a wall clock that was set back changes no order', () => {
  const store = open(join(folder.path, 'set-back'));
  store.commitNotice(notice(1, { dueAt: NEXT_DAY }), NEXT_DAY);
  store.commitNotice(notice(2, { dueAt: AT }), AT);
  expect(store.outbox().map(({ createdAt }) => createdAt)).toEqual([NEXT_DAY, AT]);
  store.commitIntake({ ...fileBatch(0, 2), at: NEXT_DAY });
  store.commitIntake({ ...fileBatch(2, 2, { path: 'night-2.csv' }), at: LATER });
  expect(store.recentFiles(5).map(({ path }) => path)).toEqual(['night-2.csv', 'night-1.csv']);
  expect(store.verify()).toEqual([]);
  store.close();
});

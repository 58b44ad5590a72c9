import { mkdtempSync, readFileSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { createGate, type Gate, type GateOptions, type LoginReport } from '../../../../daemon/review/access/gate.ts';
import { hashPassword, isPassword, writePasswordEntry } from '../../../../daemon/review/access/passwords.ts';
import { SESSION_MS } from '../../../../daemon/review/access/sessions.ts';
import { createThrottle } from '../../../../daemon/review/access/throttle.ts';
import type { Store } from '../../../../daemon/store/index.ts';
import { open, temporaryFolder } from '../../store/sample.ts';

const PASSWORD = 'correct horse battery';
/** Where the work is not what is tested. */
const CHEAP = { cost: 1024, blockSize: 8, parallelism: 1 } as const;
const HERE = '192.0.2.7';
let folder: string;
let state: ReturnType<typeof temporaryFolder>;
let store: Store;
let wallMs: number;
let monotonicMs: number;
let reports: LoginReport[];

beforeEach(async () => {
  folder = mkdtempSync(join(tmpdir(), 'spinvigil-gate-'));
  state = temporaryFolder();
  store = open(state.path);
  [wallMs, monotonicMs, reports] = [Date.parse('2026-12-01T08:00:00Z'), 1000, []];
});
afterEach(() => {
  store.close();
  state.remove();
  rmSync(folder, { recursive: true, force: true });
});

const file = () => join(folder, 'reviewers.json');
const pass = (ms: number) => {
  wallMs += ms;
  monotonicMs += ms;
};

function gate(change: Partial<GateOptions> = {}): Gate {
  return createGate({
    reviewers: ['duty', 'timing'],
    passwordFile: file(),
    isOpenToOthers: true,
    sessions: {
      put: (session) => store.putSession(session),
      find: (id) => store.session(id),
      end: (id) => store.endSession(id),
      endOlderThan: (now) => store.endSessionsOlderThan(now),
    },
    clock: { now: () => new Date(wallMs), monotonicMs: () => monotonicMs },
    onLogin: (report) => reports.push(report),
    ...change,
  });
}

async function logIn(at: Gate, change: Partial<Parameters<Gate['logIn']>[0]> = {}): Promise<string> {
  const outcome = await at.logIn({ name: 'duty', password: PASSWORD, address: HERE, earlierToken: null, ...change });
  return outcome.kind === 'in' ? outcome.token : outcome.kind;
}

describe('the gate', () => {
  test('on loopback stands open until the first password is set; beyond it it is always closed', async () => {
    const onLoopback = gate({ isOpenToOthers: false });
    expect([onLoopback.isClosed(), gate().isClosed()]).toEqual([false, true]);
    writePasswordEntry(file(), 'duty', await hashPassword(PASSWORD, CHEAP));
    expect(onLoopback.isClosed()).toBe(true);
  });

  test('lets in by name and password, and nobody whom the configuration does not name', async () => {
    const password = await hashPassword(PASSWORD, CHEAP);
    for (const name of ['duty', 'former']) writePasswordEntry(file(), name, password);
    const at = gate();
    expect(at.sessionOf(await logIn(at))).toMatchObject({ reviewer: 'duty' });
    expect(await logIn(at, { password: `${PASSWORD}x` })).toBe('wrong');
    expect(await logIn(at, { name: 'former' })).toBe('wrong');
    expect(await logIn(at, { name: 'timing' })).toBe('wrong');
  });
});

describe('E7: guessing', () => {
  test('ten thousand guesses at one account from one address are held up, and others still get in', async () => {
    writePasswordEntry(file(), 'duty', { ...(await hashPassword(PASSWORD, CHEAP)) });
    const at = gate();
    const kinds = new Map<string, number>();
    for (let guess = 0; guess < 10_000; guess++) {
      const kind = await logIn(at, { password: `guess ${guess}` });
      kinds.set(kind, (kinds.get(kind) ?? 0) + 1);
    }
    expect(Object.fromEntries(kinds)).toEqual({ wrong: 5, 'too often': 9_995 });
    expect(await logIn(at)).toBe('too often');
    expect(at.sessionOf(await logIn(at, { address: '127.0.0.1' }))).toMatchObject({ reviewer: 'duty' });
    pass(600_000);
    expect(at.sessionOf(await logIn(at))).toMatchObject({ reviewer: 'duty' });
  });

  test('many names from one address, or from the network of one IPv6 address, are held up too', async () => {
    const at = gate();
    const outcomes = await Promise.all(
      Array.from({ length: 60 }, (_, i) =>
        logIn(at, { name: `n${i}`, address: `2001:db8:7::${i.toString(16)}`, password: 'x' }),
      ),
    );
    expect(outcomes.filter((kind) => kind !== 'too often').length).toBeLessThanOrEqual(20);
    expect(await logIn(at, { name: 'n1', address: '2001:db8:8::1' })).toBe('wrong');
  });

  test('the table of tries stays small, and a success gives tries back', () => {
    let nowMs = 0;
    const throttle = createThrottle({ tries: 2, refillMs: 1000, mostKeys: 100, monotonicMs: () => nowMs });
    for (let i = 0; i < 100_000; i++) throttle.take(`key ${i}`);
    expect(throttle.size).toBe(100);
    expect([throttle.take('a'), throttle.take('a'), throttle.take('a')]).toEqual([0, 0, 1000]);
    nowMs = 400;
    expect(throttle.take('a')).toBe(600);
    nowMs = 1000;
    expect([throttle.take('a'), throttle.take('a')]).toEqual([0, 1000]);
    throttle.forgive('a');
    expect(throttle.take('a')).toBe(0);
  });

  test('an unknown name costs the same work as a known one', async () => {
    writePasswordEntry(file(), 'duty', await hashPassword(PASSWORD));
    const read = JSON.parse(readFileSync(file(), 'utf8')) as { cost: number; blockSize: number; parallelism: number }[];
    const { NOBODYS_PASSWORD } = await import('../../../../daemon/review/access/passwords.ts');
    const { cost, blockSize, parallelism } = NOBODYS_PASSWORD;
    expect(read[0]).toMatchObject({ cost, blockSize, parallelism });
    expect(await isPassword('anything', NOBODYS_PASSWORD)).toBe(false);
  });

  test('is reported without the guess, and without a name that may be one', async () => {
    const at = gate();
    await logIn(at, { name: 'duty', password: 'hunter2 hunter2' });
    await logIn(at, { name: 'my secret typed in the wrong field', password: '' });
    expect(reports).toEqual([
      { outcome: 'wrong', reviewer: 'duty', address: HERE },
      { outcome: 'wrong', reviewer: null, address: HERE },
    ]);
  });
});

describe('E8: sessions', () => {
  const ready = async (): Promise<Gate> => {
    writePasswordEntry(file(), 'duty', await hashPassword(PASSWORD, CHEAP));
    return gate();
  };

  test('have 256 random bits, and the record knows only their hash', async () => {
    const at = await ready();
    const [one, other] = [await logIn(at), await logIn(at)];
    expect(Buffer.from(one, 'base64url')).toHaveLength(32);
    expect(one).not.toBe(other);
    const id = at.sessionOf(one)?.id ?? '';
    expect(id).toMatch(/^[0-9a-f]{64}$/);
    expect(store.session(id)).toMatchObject({ reviewer: 'duty' });
    expect(at.sessionOf(id)).toBeNull();
  });

  test('change at each login: a token planted or used before opens nothing afterwards', async () => {
    const at = await ready();
    const before = await logIn(at);
    const after = await logIn(at, { earlierToken: before });
    expect([at.sessionOf(before), at.sessionOf(after)?.reviewer]).toEqual([null, 'duty']);
    expect(at.sessionOf('A'.repeat(43))).toBeNull();
  });

  test('end at logout, on the server', async () => {
    const at = await ready();
    const token = await logIn(at);
    at.logOut(token);
    expect(at.sessionOf(token)).toBeNull();
  });

  test('end after a working day, also after a restart, and whatever somebody does to the wall clock', async () => {
    const at = await ready();
    const token = await logIn(at);
    pass(SESSION_MS - 1000);
    expect(at.sessionOf(token)).not.toBeNull();
    expect(gate().sessionOf(token)).not.toBeNull();
    wallMs -= 3_600_000;
    monotonicMs += 2000;
    expect(at.sessionOf(token)).toBeNull();

    const later = await logIn(at);
    pass(SESSION_MS + 1);
    expect(gate().sessionOf(later)).toBeNull();
    const last = await logIn(at);
    wallMs -= 3_600_000;
    expect(gate().sessionOf(last)).toBeNull();
  });

  test('end with the reviewer: when the configuration does not name him any more, or gets a new password', async () => {
    const token = await logIn(await ready());
    expect(gate({ reviewers: ['timing'] }).sessionOf(token)).toBeNull();
    expect(store.endSessionsOf('duty')).toBe(1);
    expect(gate().sessionOf(token)).toBeNull();
  });
});

import { spawnSync } from 'node:child_process';
import { createHash } from 'node:crypto';
import { readdirSync, readFileSync, writeFileSync } from 'node:fs';
import type { AddressInfo } from 'node:net';
import { join } from 'node:path';
import { SMTPServer } from 'smtp-server';
import { describe, test } from 'vitest';
import { createObservatory, digestFarAway } from '../support/observatory.ts';
import { type RunningProgram, startSpinvigil, startWatch } from '../support/runningProgram.ts';
import { arrivalFile, type SyntheticArrival, syntheticArrivals, syntheticPulsar } from '../support/syntheticPulsar.ts';
import { asReader } from '../support/watchProcess.ts';
import { within } from '../support/within.ts';

// The installed program where the system gives too little, and where somebody looks for its secrets.

const PATIENCE_S = 240;
const TODAY_MJD = Math.floor(40_587 + Date.now() / 86_400_000);
const pulsar = syntheticPulsar({
  name: 'KR 0417+31',
  epochMjd: TODAY_MJD - 80,
  glitches: [{ mjd: TODAY_MJD - 12, deltaNuOverNu: 2e-7 }],
});
const arrivals = syntheticArrivals(pulsar, {
  fromMjd: TODAY_MJD - 79,
  toMjd: TODAY_MJD - 2,
  everyDays: 3,
  seed: 7,
});
const made = (options: Partial<Parameters<typeof createObservatory>[0]> = {}) =>
  createObservatory({ pulsars: [pulsar], digestCron: digestFarAway(), ...options });
const pageOf = (program: RunningProgram) => /http:\/\/\S+/.exec(program.stdout())?.[0] ?? '';

const helpersOf = (pid: number): number[] =>
  readdirSync(`/proc/${pid}/task`)
    .flatMap((task) => readFileSync(`/proc/${pid}/task/${task}/children`, 'utf8').trim().split(' '))
    .filter((child) => child !== '' && readFileSync(`/proc/${child}/cmdline`, 'utf8').includes('folderHelper'))
    .map(Number);

const canLimit = process.platform === 'linux' && spawnSync('prlimit', ['--nofile']).status === 0;
if (!canLimit) console.warn('SKIPPED: prlimit cannot be used here, so that a lack of descriptors is not tried');

test.skipIf(!canLimit)(
  'A38: without a descriptor to spare nothing is lost, and all goes on when there are some again',
  {
    timeout: 900_000,
  },
  async ({ expect, onTestFinished }) => {
    const at = await made();
    onTestFinished(at.remove);
    const program = await startWatch(onTestFinished, at.configFile);
    const descriptorsOf = (pid: number) => readdirSync(`/proc/${pid}/fd`).length;
    const limit = (pid: number, to: number) =>
      expect(spawnSync('prlimit', ['--pid', String(pid), `--nofile=${to}:`]).status).toBe(0);
    await at.drop('a.csv', arrivalFile(arrivals.slice(0, 10)));
    expect(await within(PATIENCE_S, () => program.stderr().includes('"file taken in'))).toBe(true);
    expect((await fetch(pageOf(program))).status).toBe(200);

    const all = [program.pid, ...helpersOf(program.pid)];
    expect(all).toHaveLength(2);
    const before = all.map(descriptorsOf);
    for (const pid of all) limit(pid, 3);
    await at.drop('b.csv', arrivalFile(arrivals.slice(10)));
    await fetch(pageOf(program), { signal: AbortSignal.timeout(3000) }).catch(() => null);
    const isFelt = () => /EMFILE|limit of open files/.test(program.stderr());
    expect(await within(PATIENCE_S, () => program.hasEnded() || isFelt())).toBe(true);
    expect(program.hasEnded(), program.stderr()).toBe(false);

    for (const pid of all) limit(pid, 1024);
    const isTaken = () => asReader(at, (store) => store.liveArrivals(pulsar.name).length === arrivals.length);
    expect(await within(PATIENCE_S, isTaken), program.stderr()).toBe(true);
    expect(await within(PATIENCE_S, () => readdirSync(at.mailFolder).length > 0), program.stderr()).toBe(true);
    expect((await fetch(pageOf(program))).status).toBe(200);
    // A connection of the page may still be open.
    const kept = () => all.every((pid, i) => descriptorsOf(pid) <= before[i]! + 1);
    expect(await within(PATIENCE_S, kept), String(all.map(descriptorsOf))).toBe(true);
    expect(asReader(at, (store) => store.verify())).toEqual([]);
  },
);

test('A41, B10: a file that takes all memory ends the program, and after three times it is set aside and the rest goes on', {
  timeout: 900_000,
}, async ({ expect, onTestFinished }) => {
  const at = await made();
  onTestFinished(at.remove);
  // Too many arrivals for the memory that the program gets here.
  const many = (n: number): SyntheticArrival => ({
    ...arrivals[0]!,
    mjdText: `${TODAY_MJD - 79}.${String(n).padStart(9, '0')}`,
  });
  const content = arrivalFile(Array.from({ length: 150_000 }, (_, n) => many(n)));
  const little = { NODE_OPTIONS: '--max-old-space-size=72' };
  const first = await startWatch(onTestFinished, at.configFile);
  first.signal('SIGTERM');
  expect(await first.ended, first.stderr()).toBe('0');
  await at.drop('large.csv', content);
  // Two readings were cut off before: the third and last is tried here.
  const sha256 = createHash('sha256').update(content).digest('hex');
  asReader(at, (store) => {
    for (let i = 0; i < 2; i++) store.noteReadingStarts('nightly', 'large.csv', sha256);
  });
  const dies = startSpinvigil(['watch', '--config', at.configFile], little);
  onTestFinished(() => dies.signal('SIGKILL'));
  expect(await within(PATIENCE_S, () => dies.hasEnded()), dies.stderr()).toBe(true);
  expect(dies.stderr()).toMatch(/heap out of memory|heap limit/);
  expect(asReader(at, (store) => [store.verify(), store.pulsars()])).toEqual([[], []]);

  const lives = await startWatch(onTestFinished, at.configFile, little);
  await at.drop('small.csv', arrivalFile(arrivals));
  const isTaken = () => asReader(at, (store) => store.liveArrivals(pulsar.name).length === arrivals.length);
  expect(await within(PATIENCE_S, isTaken), lives.stderr()).toBe(true);
  expect(lives.hasEnded()).toBe(false);
  expect(asReader(at, (store) => store.recentQuarantine(1))).toMatchObject([
    { file: 'large.csv', line: null, reason: expect.stringMatching(/^set aside/) },
  ]);
});

describe('F-2: the password of the mail account', () => {
  const CANARY = 'canary-8213-kestrel';

  test('is told to the mail server and to nobody else', { timeout: 900_000 }, async ({ expect, onTestFinished }) => {
    const told: string[] = [];
    const mails: Buffer[] = [];
    const server = new SMTPServer({
      disabledCommands: ['STARTTLS'],
      allowInsecureAuth: true,
      onAuth({ username, password }, _session, callback) {
        told.push(password ?? '');
        callback(null, { user: username });
      },
      onData(stream, _session, callback) {
        stream.on('data', (chunk: Buffer) => mails.push(chunk));
        stream.on('end', () => callback());
      },
    });
    server.on('error', () => {});
    await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve));
    onTestFinished(() => new Promise((resolve) => server.close(() => resolve())));
    const smtpPort = (server.server.address() as AddressInfo).port;
    const at = await made({ smtpPort, mailKeys: ['user = "spinvigil"', 'password_file = "mail-password"'] });
    onTestFinished(at.remove);
    writeFileSync(join(at.folder, 'mail-password'), `${CANARY}\n`, { mode: 0o600 });

    const program = await startWatch(onTestFinished, at.configFile);
    await at.drop('a.csv', arrivalFile(arrivals));
    const isDelivered = () =>
      asReader(at, (store) => store.outbox().length > 0 && store.outbox().every(({ state }) => state === 'delivered'));
    expect(await within(PATIENCE_S, isDelivered), program.stderr()).toBe(true);
    expect(told).toContain(CANARY);

    const id = encodeURIComponent(asReader(at, (store) => store.events()[0]!.event.id));
    const pages = ['', 'pulsars', 'feeds', 'mail', 'health', 'metrics', 'healthz', 'api/events', `events/${id}`];
    const places = new Map<string, string>();
    for (const page of pages) places.set(`page /${page}`, await (await fetch(pageOf(program) + page)).text());
    for (const pid of [program.pid, ...helpersOf(program.pid)]) {
      for (const file of ['cmdline', 'environ'])
        places.set(`${file} of ${pid}`, readFileSync(`/proc/${pid}/${file}`, 'latin1'));
    }
    program.signal('SIGTERM');
    await program.ended;
    places.set('output', program.stdout() + program.stderr());
    places.set('mail', Buffer.concat(mails).toString('latin1'));
    for (const name of readdirSync(at.stateFolder))
      places.set(name, readFileSync(join(at.stateFolder, name), 'latin1'));
    for (const place of ['mail', 'record.db', `page /events/${id}`]) expect(places.get(place)).toContain('KR 0417+31');
    expect(places.get(`environ of ${program.pid}`)).toContain('PATH=');
    const encoded = Buffer.from(CANARY).toString('base64').replace(/=+$/, '');
    for (const [place, text] of places) {
      expect(
        [CANARY, encoded].filter((secret) => text.includes(secret)),
        place,
      ).toEqual([]);
    }
  });
});

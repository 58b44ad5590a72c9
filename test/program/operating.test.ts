import { spawn, spawnSync } from 'node:child_process';
import { once } from 'node:events';
import { readdirSync, readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { setTimeout as pause } from 'node:timers/promises';
import { describe, test } from 'vitest';
import { openNotifySocket, whyNoNotifySocket } from '../support/notifySocket.ts';
import { createObservatory, digestFarAway, type TestObservatory } from '../support/observatory.ts';
import { type RunningProgram, startSpinvigil, startWatch, type WhenFinished } from '../support/runningProgram.ts';
import { CLI, runInstalled, runSpinvigil } from '../support/spinvigil.ts';
import { arrivalFile, syntheticArrivals, syntheticPulsar } from '../support/syntheticPulsar.ts';
import { within } from '../support/within.ts';

// How the daemon is kept: signals, the service manager, the monitoring system, and a world that is not as it should be.

const PATIENCE_S = 60;
const pulsar = syntheticPulsar({ name: 'KR 0417+31', epochMjd: 61_000 });
const arrivals = arrivalFile(syntheticArrivals(pulsar, { fromMjd: 61_000, toMjd: 61_060, everyDays: 3, seed: 5 }));

async function observatory(finished: WhenFinished): Promise<TestObservatory> {
  const made = await createObservatory({ pulsars: [pulsar], digestCron: digestFarAway() });
  finished(made.remove);
  return made;
}

const watch = (finished: WhenFinished, at: TestObservatory, environment: NodeJS.ProcessEnv = {}) =>
  startWatch(finished, at.configFile, environment);

const pageOf = (program: RunningProgram) => /http:\/\/\S+/.exec(program.stdout())?.[0] ?? '';
const edit = (at: TestObservatory, change: (text: string) => string) =>
  writeFileSync(at.configFile, change(readFileSync(at.configFile, 'utf8')));
/** A module that Node loads before the program. */
const planted = (code: string) => ({ NODE_OPTIONS: `--import data:text/javascript,${encodeURIComponent(code)}` });
const mailIn = (at: TestObservatory) =>
  readdirSync(at.mailFolder).map((name) => readFileSync(join(at.mailFolder, name), 'utf8'));

const missing = whyNoNotifySocket();
if (missing !== null) console.warn(`SKIPPED: ${missing}, so that nothing is said to a service manager`);

describe.concurrent('the daemon', { timeout: 180_000 }, () => {
  test('F-7: on SIGHUP takes up a good configuration and keeps the old one when the new is bad', async ({
    expect,
    onTestFinished: finished,
  }) => {
    const at = await observatory(finished);
    const program = await watch(finished, at);
    edit(at, (text) =>
      text.replace('poll_seconds', 'pole_seconds').replace('false_alerts_per_year = 1.0', 'nothing = 1'),
    );
    program.signal('SIGHUP');
    const stderr = () => program.stderr();
    expect(await within(PATIENCE_S, () => mailIn(at).length > 0), stderr()).toBe(true);
    const notice = (mailIn(at)[0] ?? '').replace(/=\r?\n/g, '');
    for (const told of [stderr(), notice]) {
      expect(told).toContain('pole_seconds');
      expect(told).toContain('false_alerts_per_year');
    }
    expect(notice).toContain('the new configuration was not taken up');
    await at.drop('one.csv', arrivals);
    expect(await within(PATIENCE_S, () => stderr().includes('"file taken in')), stderr()).toBe(true);

    edit(at, (text) =>
      text.replace('pole_seconds', 'poll_seconds').replace('nothing = 1', 'false_alerts_per_year = 2.0'),
    );
    edit(at, (text) => text.replace('name = "Kestrel Ridge"', 'name = "Kestrel Ridge West"'));
    program.signal('SIGHUP');
    expect(await within(PATIENCE_S, () => program.stdout().includes('Kestrel Ridge West: watching')), stderr()).toBe(
      true,
    );
    edit(at, (text) => text.replace('folder = "state"', 'folder = "elsewhere"'));
    program.signal('SIGHUP');
    expect(await within(PATIENCE_S, () => stderr().includes('cannot change while the watch runs')), stderr()).toBe(
      true,
    );
    program.signal('SIGTERM');
    expect(await program.ended, stderr()).toBe('0');
  });

  test.skipIf(missing !== null)(
    'B5, B11: tells systemd when it is ready, alive and stopping; and nothing while it is blocked',
    async ({ expect, onTestFinished: finished }) => {
      const at = await observatory(finished);
      const socket = await openNotifySocket(join(at.folder, 'notify'));
      finished(socket.close);
      const block = `import { writeSync } from 'node:fs';
        process.on('SIGUSR2', () => {
          writeSync(2, 'BLOCKED\\n');
          Atomics.wait(new Int32Array(new SharedArrayBuffer(4)), 0, 0, 3000);
          writeSync(2, 'FREE\\n');
        });`;
      const program = await watch(finished, at, {
        NOTIFY_SOCKET: socket.path,
        WATCHDOG_USEC: '1500000',
        ...planted(block),
      });
      const alive = () => socket.messages().filter((words) => words.includes('WATCHDOG=1')).length;
      const said = (word: string) => socket.messages().some((words) => words.includes(word));
      expect(await within(PATIENCE_S, () => said('READY=1') && alive() > 2), program.stderr()).toBe(true);

      program.signal('SIGUSR2');
      await within(PATIENCE_S, () => program.stderr().includes('BLOCKED'));
      await pause(500);
      const [first, counts] = [alive(), [] as number[]];
      while (!program.stderr().includes('FREE')) {
        counts.push(alive());
        await pause(20);
      }
      expect(counts.length).toBeGreaterThan(10);
      expect(new Set(counts.slice(0, -5))).toEqual(new Set([first]));
      expect(await within(PATIENCE_S, () => alive() > first)).toBe(true);

      program.signal('SIGTERM');
      expect(await program.ended).toBe('0');
      expect(said('STOPPING=1')).toBe(true);
    },
  );

  test('B7: a machine that slept goes on where it was', async ({ expect, onTestFinished: finished }) => {
    const at = await observatory(finished);
    const program = await watch(finished, at);
    program.signal('SIGSTOP');
    await at.drop('while-asleep.csv', arrivals);
    await pause(2000);
    program.signal('SIGCONT');
    expect(await within(PATIENCE_S, () => program.stderr().includes('"file taken in')), program.stderr()).toBe(true);
    expect(program.stderr().split('"file taken in').length - 1).toBe(1);
    program.signal('SIGTERM');
    expect(await program.ended).toBe('0');
  });

  test('B13: a promise that nobody awaited ends it with one line, and the record is whole', async ({
    expect,
    onTestFinished: finished,
  }) => {
    const at = await observatory(finished);
    const program = await watch(
      finished,
      at,
      planted(`process.on('SIGUSR2', () => Promise.reject(new Error('planted')));`),
    );
    program.signal('SIGUSR2');
    expect(await program.ended).toBe('1');
    const last = program.stderr().trim().split('\n').at(-1) ?? '';
    expect(JSON.parse(last)).toMatchObject({ level: 'fatal', err: { message: 'planted' } });
    const { code, stdout } = await runSpinvigil(['check', '--config', at.configFile, '--json']);
    expect([code, (JSON.parse(stdout) as { record: string[] }).record]).toEqual([0, []]);
  });

  test('B15: goes on when nobody reads its output any more', async ({ expect, onTestFinished: finished }) => {
    const at = await observatory(finished);
    const child = spawn(process.execPath, [CLI, 'watch', '--config', at.configFile], {
      stdio: ['ignore', 'pipe', 'pipe'],
    });
    const ended = once(child, 'exit');
    finished(async () => {
      child.kill('SIGKILL');
      await ended;
    });
    await once(child.stdout, 'data');
    child.stdout.destroy();
    child.stderr.destroy();
    await at.drop('unheard.csv', arrivals);
    const isTakenIn = async () =>
      (await runSpinvigil(['arrivals', pulsar.name, '--config', at.configFile, '--json'])).stdout.length > 100;
    expect(await within(PATIENCE_S, isTakenIn)).toBe(true);
    child.kill('SIGTERM');
    expect((await ended)[0]).toBe(0);
  });

  test('B16: a database module of another Node is named at the start', async ({ expect, onTestFinished: finished }) => {
    const at = await observatory(finished);
    const wrong = planted(
      `process.dlopen = () => { throw Object.assign(new Error('was compiled against a different Node.js version'), { code: 'ERR_DLOPEN_FAILED' }); };`,
    );
    const program = startSpinvigil(['watch', '--config', at.configFile], wrong);
    expect(await program.ended).toBe('1');
    expect(program.stderr()).toMatch(/^spinvigil: the database module does not fit this Node .* run npm ci again.*\n$/);
  });

  test('B17: language, zone and other settings of the host change no number', async ({
    expect,
    onTestFinished: finished,
  }) => {
    const strange = { LANG: 'tr_TR.UTF-8', LC_ALL: 'tr_TR.UTF-8', TZ: 'Pacific/Kiritimati', NODE_ENV: 'x' };
    const elsewhere = (args: readonly string[]) => runInstalled(args, { environment: strange });
    const outputs = [];
    for (const run of [runSpinvigil, elsewhere]) {
      const at = await observatory(finished);
      const file = join(at.folder, 'archive.csv');
      writeFileSync(file, arrivals);
      const config = ['--config', at.configFile];
      expect((await run(['replay', file, '--feed', 'nightly', ...config])).code).toBe(0);
      const arrivalsAs = (form: string) => run(['arrivals', pulsar.name, form, ...config]);
      outputs.push([await arrivalsAs('--json'), await arrivalsAs('--csv')]);
    }
    expect(outputs[0]?.[0]?.stdout.length).toBeGreaterThan(1000);
    expect(outputs[1]).toEqual(outputs[0]);
  });

  const mayUnshare = spawnSync('unshare', ['--pid', '--fork', 'true']).status === 0;
  if (!mayUnshare)
    console.warn('SKIPPED: no right to make a process namespace, so that the daemon is not tried as process 1');
  test.skipIf(!mayUnshare)(
    'B18: works and stops as process 1, without a service manager',
    async ({ expect, onTestFinished: finished }) => {
      const at = await observatory(finished);
      const args = ['--pid', '--fork', '--kill-child', process.execPath, CLI, 'watch', '--config', at.configFile];
      const child = spawn('unshare', args, {
        stdio: ['ignore', 'pipe', 'ignore'],
        env: { ...process.env, NOTIFY_SOCKET: '' },
      });
      const ended = once(child, 'exit');
      finished(async () => {
        child.kill('SIGKILL');
        await ended;
      });
      await once(child.stdout, 'data');
      const inner = readFileSync(`/proc/${child.pid}/task/${child.pid}/children`, 'utf8').trim();
      process.kill(Number(inner), 'SIGTERM');
      expect((await ended)[0]).toBe(0);
    },
  );

  test('lets reviewers in by the password that the command sets, and counts for a monitoring system', async ({
    expect,
    onTestFinished: finished,
  }) => {
    const at = await observatory(finished);
    const program = await watch(finished, at);
    const page = pageOf(program);
    const metrics = async () => fetch(`${page}metrics`);
    expect(await (await metrics()).text()).toContain('spinvigil_stage_late{stage="feed nightly"} 0');

    const set = (name: string, password: string) =>
      runInstalled(['reviewer', name, '--config', at.configFile], { input: `${password}\n` });
    const misspelt = { code: 2, stderr: expect.stringContaining('did you mean duty?') };
    expect(await set('dutty', 'correct horse battery')).toMatchObject(misspelt);
    const tooShort = { code: 2, stderr: expect.stringContaining('give 12 at least') };
    expect(await set('duty', 'short')).toMatchObject(tooShort);
    expect((await set('duty', 'correct horse battery')).code).toBe(0);

    expect((await metrics()).status).toBe(401);
    const form = await (await fetch(`${page}login`)).text();
    const token = /name="token" value="([^"]*)"/.exec(form)?.[1] ?? '';
    const answer = await fetch(`${page}login`, {
      method: 'POST',
      redirect: 'manual',
      headers: { Origin: page.slice(0, -1) },
      body: new URLSearchParams({ name: 'duty', password: 'correct horse battery', next: '/', token }),
    });
    expect(answer.status).toBe(303);
    const headers = { Cookie: answer.headers.get('set-cookie')?.split(';')[0] ?? '' };
    expect((await fetch(`${page}metrics`, { headers })).status).toBe(200);

    // A new password ends what the old one opened.
    expect((await set('duty', 'another correct horse')).code).toBe(0);
    expect((await fetch(`${page}metrics`, { headers })).status).toBe(401);
    expect(program.stderr() + program.stdout()).not.toContain('correct horse');
    program.signal('SIGTERM');
    expect(await program.ended).toBe('0');
  });
});

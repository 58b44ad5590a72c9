import { type AddressInfo, createServer, type Socket } from 'node:net';
import { describe, test } from 'vitest';
import type { PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import { type MailServer, startMailServer } from '../support/mailServer.ts';
import {
  createObservatory,
  digestFarAway,
  type ObservatoryOptions,
  type TestObservatory,
} from '../support/observatory.ts';
import { type RunningProgram, startWatch, type WhenFinished } from '../support/runningProgram.ts';
import { runInstalled, runSpinvigil, spinvigilJson } from '../support/spinvigil.ts';
import { arrivalFile, syntheticArrivals, syntheticPulsar } from '../support/syntheticPulsar.ts';
import { within } from '../support/within.ts';

// The daemon as it is installed, with real files, a real record, a real mail server and real signals.

const PATIENCE_S = 60;
const TODAY_MJD = Math.floor(40_587 + Date.now() / 86_400_000);
const GLITCH_MJD = TODAY_MJD - 12;
const pulsar = syntheticPulsar({
  name: 'KR 0417+31',
  epochMjd: TODAY_MJD - 60,
  glitches: [{ mjd: GLITCH_MJD, deltaNuOverNu: 2e-7 }],
});
const arrivals = syntheticArrivals(pulsar, { fromMjd: TODAY_MJD - 57, toMjd: TODAY_MJD - 2, everyDays: 3, seed: 7 });
const before = arrivals.filter(({ mjdText }) => Number(mjdText) < GLITCH_MJD);
const after = arrivals.filter(({ mjdText }) => Number(mjdText) >= GLITCH_MJD);

async function observatory(
  finished: WhenFinished,
  options: Partial<ObservatoryOptions> = {},
): Promise<TestObservatory> {
  const made = await createObservatory({ pulsars: [pulsar], digestCron: digestFarAway(), ...options });
  finished(made.remove);
  return made;
}

async function mailServer(finished: WhenFinished): Promise<MailServer> {
  const server = await startMailServer();
  finished(server.close);
  return server;
}

const watch = (finished: WhenFinished, at: TestObservatory) => startWatch(finished, at.configFile);
const events = (at: TestObservatory) => spinvigilJson<PulsarEvent[]>(['events', '--config', at.configFile]);
const takenIn = (program: RunningProgram, files: number) =>
  within(PATIENCE_S, () => program.stderr().split('"file taken in').length - 1 >= files);

// Most of each test is waiting for files to stand still: they wait together.
describe.concurrent('the watch', { timeout: 180_000 }, () => {
  test('turns a dropped file into mail, and says how long that took', async ({ expect, onTestFinished: finished }) => {
    const server = await mailServer(finished);
    const at = await observatory(finished, {
      smtpPort: server.port,
      to: ['duty@kestrel-ridge.example', 'timing@kestrel-ridge.example'],
    });
    await at.drop('before.csv', arrivalFile(before));
    const program = await watch(finished, at);
    expect(program.stdout()).toMatch(/^Kestrel Ridge: watching nightly .* http:\/\/127\.0\.0\.1:\d+\/\n$/);
    expect(await takenIn(program, 1)).toBe(true);
    expect(server.accepted).toEqual([]);

    const writtenMs = Date.now();
    await at.drop('after.csv', arrivalFile(after));
    expect(await within(PATIENCE_S, () => server.accepted.length >= 2)).toBe(true);
    const [first] = server.accepted;
    console.info(`last write to acceptance by the mail server: ${((first!.atMs - writtenMs) / 1000).toFixed(1)} s`);

    expect(server.accepted.map(({ recipient }) => recipient).sort()).toEqual([
      'duty@kestrel-ridge.example',
      'timing@kestrel-ridge.example',
    ]);
    const { mail } = first!;
    expect(mail.subject).toContain('KR 0417+31');
    expect(mail.subject).toContain('candidate glitch');
    expect(mail.headers.get('auto-submitted')).toBe('auto-generated');
    const [event, ...rest] = await events(at);
    expect(rest).toEqual([]);
    expect(event).toMatchObject({ pulsar: 'KR 0417+31', state: 'confirmed', explanation: 'glitch' });
    expect(Math.abs(event!.deltaNuOverNu! / 2e-7 - 1)).toBeLessThan(0.02);
    // The page's address of the start line answers, and shows the event.
    const [url] = /http:\S+/.exec(program.stdout())!;
    expect(await (await fetch(url)).text()).toContain('KR 0417+31');
  });

  test('B3: lets nobody else into its state folder, and frees it when it is killed', async ({
    expect,
    onTestFinished: finished,
  }) => {
    const at = await observatory(finished);
    const first = await watch(finished, at);
    const second = await runInstalled(['watch', '--config', at.configFile]);
    expect(second.code).toBe(3);
    expect(second.stderr).toMatch(/another instance holds this state folder/);
    const replay = await runSpinvigil(['replay', at.configFile, '--feed', 'nightly', '--config', at.configFile]);
    expect(replay.code).toBe(3);
    expect(first.hasEnded()).toBe(false);
    first.signal('SIGKILL');
    await first.ended;
    const third = await watch(finished, at);
    expect(third.stdout()).toContain('watching nightly');
  });

  test('B5: ends well on SIGTERM in the middle of a file, and takes it up at the next start', async ({
    expect,
    onTestFinished: finished,
  }) => {
    const at = await observatory(finished);
    await at.drop('all.csv', arrivalFile(arrivals));
    const program = await watch(finished, at);
    await within(PATIENCE_S, () => program.stderr().includes('event changed'));
    const askedMs = Date.now();
    program.signal('SIGTERM');
    expect(await program.ended, program.stderr()).toBe('0');
    console.info(`SIGTERM while a mail is composed: ended after ${((Date.now() - askedMs) / 1000).toFixed(1)} s`);

    const again = await watch(finished, at);
    expect(await within(PATIENCE_S, async () => (await events(at)).length === 1)).toBe(true);
    again.signal('SIGTERM');
    expect(await again.ended).toBe('0');
  });

  test('B5: ends well on SIGINT', async ({ expect, onTestFinished: finished }) => {
    const program = await watch(finished, await observatory(finished));
    program.signal('SIGINT');
    expect(await program.ended, program.stderr()).toBe('0');
  });

  test('B5: is not kept from ending by a mail server that hangs', async ({ expect, onTestFinished: finished }) => {
    const sockets: Socket[] = [];
    const silent = createServer((socket) => void sockets.push(socket.on('error', () => {})));
    await new Promise<void>((resolve) => silent.listen(0, '127.0.0.1', resolve));
    finished(async () => {
      for (const socket of sockets) socket.destroy();
      silent.close();
    });
    const at = await observatory(finished, { smtpPort: (silent.address() as AddressInfo).port });
    await at.drop('all.csv', arrivalFile(arrivals));
    const impatient = await watch(finished, at);
    expect(await within(PATIENCE_S, () => sockets.length > 0), impatient.stderr()).toBe(true);
    impatient.signal('SIGTERM');
    expect(await within(PATIENCE_S, () => impatient.stderr().includes('"stopping"'))).toBe(true);
    impatient.signal('SIGTERM');
    expect(await impatient.ended).toBe('SIGKILL');

    const patient = await watch(finished, at);
    expect(await within(PATIENCE_S, () => sockets.length > 1), patient.stderr()).toBe(true);
    patient.signal('SIGTERM');
    expect(await patient.ended, patient.stderr()).toBe('0');
  });

  test('tells the others when one address refuses, and goes on', async ({ expect, onTestFinished: finished }) => {
    const server = await mailServer(finished);
    server.refuse('duty@kestrel-ridge.example', 550);
    const at = await observatory(finished, {
      smtpPort: server.port,
      to: ['duty@kestrel-ridge.example', 'night@kestrel-ridge.example'],
    });
    await at.drop('all.csv', arrivalFile(arrivals));
    await watch(finished, at);
    const subjects = () => server.accepted.map(({ recipient, mail }) => `${recipient} ${mail.subject}`);
    const wanted = (recipient: string, words: string) =>
      subjects().some((subject) => subject.startsWith(recipient) && subject.includes(words));
    expect(
      await within(
        PATIENCE_S,
        () =>
          wanted('night@kestrel-ridge.example', 'candidate glitch') &&
          wanted('night@kestrel-ridge.example', 'mail to duty@kestrel-ridge.example was refused'),
      ),
      subjects().join('\n'),
    ).toBe(true);
  });

  test('lets rows wait for a model, and takes them in when there is one', async ({
    expect,
    onTestFinished: finished,
  }) => {
    const stranger = syntheticPulsar({ name: 'KR 2222-22', epochMjd: TODAY_MJD - 220 });
    const strange = syntheticArrivals(stranger, {
      fromMjd: TODAY_MJD - 20,
      toMjd: TODAY_MJD - 2,
      everyDays: 3,
      seed: 8,
    });
    const at = await observatory(finished);
    await at.drop('mixed.csv', arrivalFile([...before, ...strange]));
    const first = await watch(finished, at);
    expect(await takenIn(first, 1)).toBe(true);
    first.signal('SIGTERM');
    await first.ended;
    const morning = await spinvigilJson<{ quarantined: { reason: string }[] }>(['morning', '--config', at.configFile]);
    expect(morning.quarantined).toHaveLength(strange.length);
    expect(morning.quarantined[0]?.reason).toMatch(/pulsar "KR 2222-22" has no model: add one/);

    await at.addModel(stranger);
    const second = await watch(finished, at);
    expect(await takenIn(second, 1)).toBe(true);
    second.signal('SIGTERM');
    await second.ended;
    const taken = await spinvigilJson<unknown[]>(['arrivals', 'KR 2222-22', '--config', at.configFile]);
    expect(taken).toHaveLength(strange.length);
  });
});

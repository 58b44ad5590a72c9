import { cp, mkdtemp, readFile, rm, writeFile } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { runWatch } from '../../daemon/lifecycle.ts';
import { silentLog } from '../../daemon/log.ts';
import { createServiceManager } from '../../daemon/serviceManager.ts';
import { openStore } from '../../daemon/store/index.ts';
import { createSummons } from '../../daemon/summons.ts';
import { type AcceptedMail, type MailServer, startMailServer } from '../support/mailServer.ts';
import { createObservatory, digestFarAway, type TestObservatory } from '../support/observatory.ts';
import { startSpinvigil } from '../support/runningProgram.ts';
import { runSpinvigil } from '../support/spinvigil.ts';
import { arrivalFile, syntheticArrivals, syntheticPulsar } from '../support/syntheticPulsar.ts';
import { within } from '../support/within.ts';

// kill -9 at the first step, at the second, at the third … until a run ends without meeting its fault (the method is that of SQLite's
// own crash tests, sqlite.org/testing.html). After each, the program is started again as if nothing had happened.

const TODAY_MJD = Math.floor(40_587 + Date.now() / 86_400_000);
const pulsar = syntheticPulsar({
  name: 'KR 0417+31',
  epochMjd: TODAY_MJD - 60,
  glitches: [{ mjd: TODAY_MJD - 12, deltaNuOverNu: 2e-7 }],
});
const arrivals = syntheticArrivals(pulsar, { fromMjd: TODAY_MJD - 57, toMjd: TODAY_MJD - 2, everyDays: 3, seed: 7 });
const RECIPIENTS = ['duty@kestrel-ridge.example', 'timing@kestrel-ridge.example'];
const MOST_STEPS = 100;
const LANES = 3;
/** Of a replay with mail: past the composing, before the commit. */
const FIRST_STEP_BEHIND_MAIL = 10;

let server: MailServer;
let observatory: TestObservatory;
let copies: string;

beforeAll(async () => {
  server = await startMailServer();
  const mail = { smtpPort: server.port, to: RECIPIENTS, digestCron: digestFarAway() };
  observatory = await createObservatory({ pulsars: [pulsar], ...mail });
  await observatory.drop('before.csv', arrivalFile(arrivals.slice(0, -5)));
  await observatory.drop('after.csv', arrivalFile(arrivals.slice(-5)));
  const before = join(observatory.feedFolder, 'before.csv');
  const { code, stderr } = await runSpinvigil(['replay', before, '--config', observatory.configFile]);
  expect(code, stderr).toBe(0);
  copies = await mkdtemp(join(tmpdir(), 'spinvigil-crash-'));
}, 60_000);

afterAll(async () => {
  await server.close();
  await observatory.remove();
  await rm(copies, { recursive: true, force: true });
});

/** The observatory as it stood before the crash, in a folder of its own. */
async function copyOf(from: string, name: string): Promise<string> {
  const to = join(copies, name);
  await cp(from, to, { recursive: true });
  return to;
}

const configIn = (folder: string) => join(folder, 'spinvigil.toml');
const replayIn = (folder: string, ...options: string[]) => [
  'replay',
  ...options,
  join(folder, 'arrivals', 'after.csv'),
  '--config',
  configIn(folder),
];

interface Steps {
  readonly from: number;
  readonly stride: number;
}

/** Replays the last file, killed at each step from `from` on and then started again; all must end as an undisturbed replay does. */
async function killedReplays({ options, ...steps }: Steps & { readonly options: readonly string[] }) {
  const reference = await copyOf(observatory.folder, `undisturbed-${steps.from}`);
  expect((await runSpinvigil(replayIn(reference, ...options))).code).toBe(0);
  const expected = await whatIsOnRecord(reference);
  const killed = await untilClean(steps, async (step) => {
    const folder = await copyOf(observatory.folder, `intake-${steps.from}-${step}`);
    const run = startSpinvigil(replayIn(folder, ...options), { SPINVIGIL_TEST_KILL_AT: String(step) });
    const end = await run.ended;
    expect(['SIGKILL', '0'], run.stderr()).toContain(end);
    // The start after the crash is made in this process: the same code, and a second less.
    expect((await runSpinvigil(replayIn(folder, ...options))).code).toBe(0);
    expect(await whatIsOnRecord(folder), `killed at step ${step}`).toEqual(expected);
    await rm(folder, { recursive: true });
    return end === 'SIGKILL' ? 'killed' : 'clean';
  });
  return { expected, killed };
}

/** Runs `attempt` with a fault at every `stride`th step, a few side by side, until one answers that it met no fault. */
async function untilClean(
  { from, stride }: Steps,
  attempt: (step: number) => Promise<'killed' | 'clean'>,
): Promise<number> {
  let next = from;
  let killed = 0;
  let clean = false;
  const lane = async () => {
    while (!clean && next <= MOST_STEPS) {
      const step = next;
      next += stride;
      if ((await attempt(step)) === 'clean') clean = true;
      else killed += 1;
    }
  };
  await Promise.all(Array.from({ length: LANES }, lane));
  expect(clean).toBe(true);
  return killed;
}

/** All that a person could see, without the times at which things were written. */
async function whatIsOnRecord(folder: string) {
  const opened = openStore(join(folder, 'state'), { mode: 'reader' });
  if (!opened.ok) throw new Error(opened.failure.message);
  const { store } = opened;
  try {
    expect(store.verify()).toEqual([]);
    return {
      events: store.events().map(({ event, revision }) => ({ event, revision })),
      history: store.events().map(({ event }) => store.event(event.id)?.history.map(({ what }) => what)),
      arrivals: store.arrivals(pulsar.name).map(({ takenInAt: _, fileId: __, ...arrival }) => arrival),
      mail: store.outbox().map(({ messageId, recipient, subject }) => ({ messageId, recipient, subject })),
    };
  } finally {
    store.close();
  }
}

describe('kill -9', () => {
  // Composing a mail takes a second, so that the steps which come before it are tried without. Here some of the steps;
  // test/studies/killLoop.ts goes through all of them.
  test('B1: at the steps of taking a file in: the next start ends up where an undisturbed run does', async () => {
    const quietly = await killedReplays({ from: 1, stride: 3, options: [] });
    expect(quietly.expected.events).toHaveLength(1);
    console.info(`taking a file in: killed at ${quietly.killed} steps`);
    expect(quietly.killed).toBeGreaterThan(5);

    const mailing = await killedReplays({ from: FIRST_STEP_BEHIND_MAIL, stride: 2, options: ['--mail'] });
    expect(mailing.expected.mail.map(({ recipient }) => recipient)).toEqual(RECIPIENTS);
    console.info(`with mail: killed at ${mailing.killed} more`);
    expect(mailing.killed).toBeGreaterThan(0);
  }, 240_000);

  test('B1, D8: at every step of delivering mail: nothing is lost, at most one copy comes twice, and says so', async () => {
    const queued = await copyOf(observatory.folder, 'queued');
    expect((await runSpinvigil(replayIn(queued, '--mail'))).code).toBe(0);
    let marked = 0;
    const killed = await untilClean({ from: 1, stride: 1 }, async (step) => {
      const own = await startMailServer();
      const folder = await copyOf(queued, `mail-${step}`);
      await pointAt(configIn(folder), own.port);
      const isSettled = () => own.accepted.length >= RECIPIENTS.length && isDelivered(folder);
      const first = startSpinvigil(['watch', '--config', configIn(folder)], { SPINVIGIL_TEST_KILL_AT: String(step) });
      const started = () => first.stdout().includes('\n');
      await within(60, () => first.hasEnded() || (started() && isSettled()));
      const wasKilled = first.hasEnded();
      if (!wasKilled) first.signal('SIGTERM');
      expect(await first.ended, first.stderr()).toBe(wasKilled ? 'SIGKILL' : '0');

      await watchHere(folder, isSettled);
      marked += checkCopies(own.accepted, `killed at step ${step}`);
      await own.close();
      await rm(folder, { recursive: true });
      return wasKilled ? 'killed' : 'clean';
    });
    console.info(`delivering mail: killed at ${killed} steps, ${marked} marked copies`);
    expect(killed).toBeGreaterThan(5);
    // The instant between the server's acceptance and our note of it, once for each recipient.
    expect(marked).toBeGreaterThan(0);
  }, 240_000);
});

async function pointAt(configFile: string, port: number): Promise<void> {
  const text = await readFile(configFile, 'utf8');
  await writeFile(configFile, text.replace(/^port = \d+$/m, `port = ${port}`));
}

/** The start after the crash, in this process, until `what` holds. */
async function watchHere(folder: string, what: () => boolean): Promise<void> {
  const stop = new AbortController();
  const log = silentLog();
  const manager = createServiceManager({ environment: {}, log });
  const parts = { log, manager, stop: stop.signal, reload: createSummons(), say: () => {} };
  const watch = runWatch({ configFile: configIn(folder), ...parts });
  try {
    expect(await within(60, what)).toBe(true);
  } finally {
    stop.abort('SIGTERM');
    await watch;
  }
}

function isDelivered(folder: string): boolean {
  const opened = openStore(join(folder, 'state'), { mode: 'reader' });
  if (!opened.ok) return false;
  try {
    return opened.store.outbox({ kind: 'event' }).every(({ state }) => state === 'delivered');
  } finally {
    opened.store.close();
  }
}

/** Answers how many marked copies there were. */
function checkCopies(accepted: readonly AcceptedMail[], when: string): number {
  const events = accepted.filter(({ mail }) => mail.messageId?.startsWith('<event.'));
  expect(new Set(events.map(({ recipient }) => recipient)), when).toEqual(new Set(RECIPIENTS));
  expect(new Set(events.map(({ mail }) => mail.messageId)).size, when).toBe(1);
  const copies = events.filter(({ mail }) => mail.subject?.includes('[possible duplicate]'));
  expect(events.length - copies.length, when).toBeLessThanOrEqual(RECIPIENTS.length);
  expect(events.length, when).toBeLessThanOrEqual(RECIPIENTS.length + 1);
  return copies.length;
}

// kill -9 at the first step of the whole way, at the second, at the third … until a run ends without meeting it:  npx tsx test/studies/killLoop.ts [FROM] [TO]
// The way: a file is taken in, its event decided and mailed over SMTP, judged on the page, taken up again and judged by the command
// (test/support/fullScenario.ts). After each kill the same is started once more; at every fifth, that start is killed too. What must hold: the record is
// whole, what was told to anybody is on it, all ends as an undisturbed run does, and no more than one copy of a mail comes twice, marked. A reviewer
// whose verdict was cut off before the answer sends the form again: the page says what stands, and no verdict is there twice or lost (E12). Writes
// what it found beside itself.
import assert from 'node:assert/strict';
import { spawn } from 'node:child_process';
import { writeFileSync } from 'node:fs';
import { cp, mkdtemp, readFile, rm, writeFile } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { openStore } from '../../daemon/store/index.ts';
import { type MailServer, startMailServer } from '../support/mailServer.ts';
import { createObservatory, digestFarAway } from '../support/observatory.ts';
import { ROOT } from '../support/sourceTree.ts';
import { arrivalFile, syntheticArrivals, syntheticPulsar } from '../support/syntheticPulsar.ts';

const from = Number(process.argv[2] ?? 1);
const to = Number(process.argv[3] ?? 200);
const KILL_AGAIN_AT_EVERY = 5;
const RECIPIENTS = ['duty@kestrel-ridge.example', 'timing@kestrel-ridge.example'];
const TODAY_MJD = Math.floor(40_587 + Date.now() / 86_400_000);
const pulsar = syntheticPulsar({
  name: 'KR 0417+31',
  epochMjd: TODAY_MJD - 80,
  glitches: [{ mjd: TODAY_MJD - 12, deltaNuOverNu: 2e-7 }],
});
const span = { fromMjd: TODAY_MJD - 79, toMjd: TODAY_MJD - 2, everyDays: 3, seed: 7 };

interface Run {
  readonly end: string;
  readonly told: readonly string[];
}

function run(folder: string, killAt: number): Promise<Run> {
  const args = ['--import', 'tsx', join(ROOT, 'test/support/fullScenario.ts')];
  const child = spawn(process.execPath, [...args, join(folder, 'spinvigil.toml'), join(folder, 'arrivals/a.csv')], {
    cwd: ROOT,
    env: { ...process.env, SPINVIGIL_TEST_KILL_AT: String(killAt) },
    stdio: ['ignore', 'pipe', 'pipe'],
  });
  let said = '';
  let complained = '';
  child.stdout.on('data', (chunk) => (said += chunk));
  child.stderr.on('data', (chunk) => (complained += chunk));
  return new Promise((resolve, reject) =>
    child.on('close', (code, signal) => {
      if (signal === null && code !== 0) reject(new Error(`ended with ${code}: ${complained}`));
      else resolve({ end: signal ?? String(code), told: said.split('\n').filter((line) => line !== '') });
    }),
  );
}

/** All that a person could see, without the times at which things were written. */
function onRecord(folder: string) {
  const opened = openStore(join(folder, 'state'), { mode: 'reader' });
  if (!opened.ok) return { problems: [], events: [], verdicts: [], mail: [], arrivals: 0 };
  const { store } = opened;
  const records = store.events().map(({ event }) => store.event(event.id)!);
  const found = {
    problems: store.verify(),
    events: records.map(({ event, revision, history }) => ({ event, revision, what: history.map(({ what }) => what) })),
    verdicts: records.flatMap((record) => record.verdicts.map(({ verdict, by, note }) => ({ verdict, by, note }))),
    mail: store.outbox().map(({ messageId, recipient, state }) => ({ messageId, recipient, state })),
    arrivals: store.liveArrivals(pulsar.name).length,
  };
  store.close();
  return found;
}

type Found = ReturnType<typeof onRecord>;

function checkTold({ problems, events, verdicts, mail, arrivals }: Found, told: readonly string[], when: string): void {
  assert.deepEqual(problems, [], when);
  assert.ok(arrivals === 0 || arrivals === expected.arrivals, `${when}: a file is taken in whole or not at all`);
  if (told.includes('taken in')) assert.equal(events.length, 1, when);
  if (told.includes('delivered'))
    assert.ok(
      mail.every(({ state }) => state === 'delivered'),
      when,
    );
  const judged = ['judged on the page', 'reopen by command', 'reject by command'];
  assert.ok(verdicts.length >= judged.filter((line) => told.includes(line)).length, `${when}: a verdict is lost`);
}

/** Answers how many marked copies came. */
function checkCopies({ accepted }: MailServer, when: string): number {
  assert.deepEqual(new Set(accepted.map(({ recipient }) => recipient)), new Set(RECIPIENTS), when);
  assert.equal(new Set(accepted.map(({ mail }) => mail.messageId)).size, 1, when);
  const copies = accepted.filter(({ mail }) => mail.subject?.includes('[possible duplicate]')).length;
  assert.ok(accepted.length - copies <= RECIPIENTS.length, `${when}: an unmarked copy came twice`);
  return copies;
}

async function tried(killAt: number, template: string): Promise<{ wasKilled: boolean; kills: number; copies: number }> {
  const server = await startMailServer();
  const folder = join(await mkdtemp(join(tmpdir(), 'spinvigil-kill-')), 'observatory');
  await cp(template, folder, { recursive: true });
  const config = join(folder, 'spinvigil.toml');
  await writeFile(config, (await readFile(config, 'utf8')).replace(/^port = \d+$/m, `port = ${server.port}`));
  const when = `killed at step ${killAt}`;
  const runs = [await run(folder, killAt)];
  const wasKilled = runs[0]!.end === 'SIGKILL';
  if (wasKilled && killAt % KILL_AGAIN_AT_EVERY === 0) runs.push(await run(folder, 1 + (killAt % 7)));
  const kills = runs.filter(({ end }) => end === 'SIGKILL').length;
  checkTold(
    onRecord(folder),
    runs.flatMap(({ told }) => told),
    when,
  );
  if (wasKilled) assert.equal((await run(folder, 0)).told.at(-1), 'done', when);
  assert.deepEqual(onRecord(folder), expected, when);
  const copies = checkCopies(server, when);
  assert.ok(copies <= kills, `${when}: more copies than kills`);
  await server.close();
  await rm(join(folder, '..'), { recursive: true });
  return { wasKilled, kills, copies };
}

const server = await startMailServer();
const mail = { smtpPort: server.port, to: RECIPIENTS, digestCron: digestFarAway() };
const observatory = await createObservatory({ pulsars: [pulsar], ...mail });
await observatory.drop('a.csv', arrivalFile(syntheticArrivals(pulsar, span)));
const template = await mkdtemp(join(tmpdir(), 'spinvigil-kill-'));
await cp(observatory.folder, template, { recursive: true });
assert.equal((await run(observatory.folder, 0)).told.at(-1), 'done');
const expected = onRecord(observatory.folder);
assert.equal(expected.verdicts.length, 3);
await server.close();

let steps = 0;
let kills = 0;
let copies = 0;
let isClean = false;
for (let killAt = from; killAt <= to && !isClean; killAt++) {
  const one = await tried(killAt, template);
  isClean = !one.wasKilled;
  if (one.wasKilled) steps += 1;
  kills += one.kills;
  copies += one.copies;
  const result = { from, steps, kills, markedCopies: copies, endedClean: isClean };
  const dated = { date: new Date().toISOString().slice(0, 10), ...result };
  writeFileSync(new URL('killLoop.json', import.meta.url), `${JSON.stringify(dated, null, 2)}\n`);
  console.log(`step ${killAt}: ${one.wasKilled ? 'killed' : 'clean'}; so far`, result);
}
await observatory.remove();
await rm(template, { recursive: true });

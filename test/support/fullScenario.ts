// The whole way once, in a process of its own that may be killed at any step:  tsx test/support/fullScenario.ts CONFIG FILE
// A file is taken in, its event decided and mailed, judged on the page, taken up again and judged by the command. Run again, it goes on where the
// record stands. Each line that it prints is something that somebody outside was told.
import { existsSync, readFileSync, rmSync, writeFileSync, writeSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { setTimeout as pause } from 'node:timers/promises';
import { systemClock } from '../../daemon/clock.ts';
import { review } from '../../daemon/commands/review.ts';
import { silentLog } from '../../daemon/log.ts';
import { mailerFor } from '../../daemon/mailerFor.ts';
import { morningReview } from '../../daemon/morning.ts';
import { loadOrders, openRecord } from '../../daemon/opening.ts';
import { replay } from '../../daemon/replay.ts';
import { createStoreDesk } from '../../daemon/review/storeDesk.ts';
import { createVerdictTokens } from '../../daemon/review/verdictToken.ts';
import { openReviewPage } from '../../daemon/reviewPage.ts';
import { startDelivery } from '../../daemon/schedule/deliver.ts';
import { createStation, type Station } from '../../daemon/station.ts';
import { loadTables } from '../../daemon/tables/loadTables.ts';

const [configFile = '', file = ''] = process.argv.slice(2);
const tell = (line: string) => writeSync(1, `${line}\n`);
const fail = (error: unknown) => {
  throw error;
};

const { configuration } = loadOrders(configFile);
const store = openRecord(configuration, 'daemon');
const clock = systemClock;
const log = silentLog();
const { tables } = loadTables();
const station = createStation({ configuration, store, tables, clock, log, reviewUrl: () => null });

await replay(station, { files: [file], feed: null, mail: true, onProgress: () => {} });
tell('taken in');
await deliver(station);
tell('delivered');
const { id } = store.events()[0]!.event;
const verdicts = () => store.event(id)!.verdicts.map(({ verdict }) => verdict);
const browserFile = join(dirname(configFile), 'reviewers-browser.txt');
if (verdicts().length === 0 || existsSync(browserFile)) await judgeOnPage(station);
tell('judged on the page');
const terminal = { out: () => {}, err: () => {}, isTty: false } as never;
for (const [n, verdict] of (['reopen', 'reject'] as const).entries()) {
  if (verdicts().length > n + 1) continue;
  await review(terminal, id, { config: configFile, [verdict]: true, by: 'duty', note: 'a cable' });
  tell(`${verdict} by command`);
}
store.close();
tell('done');
process.exit(0);

async function deliver({ configuration: { mail } }: Station): Promise<void> {
  const loop = startDelivery({
    store,
    mailer: mailerFor(mail),
    from: mail.from,
    clock,
    log,
    onGivenUp: async (copy, state, why) => fail(new Error(`${copy.subject} ${state}: ${why}`)),
    onFatal: fail,
  });
  while (store.outbox().some(({ state }) => state !== 'delivered')) await pause(10);
  await loop.stop(1000);
}

async function judgeOnPage(own: Station): Promise<void> {
  const desk = createStoreDesk({
    configuration,
    store,
    clock,
    morning: () => morningReview({ configuration, store, clock, warnings: [] }),
    health: () => ({ ok: true, problems: [] }),
    vitalSigns: () => fail(new Error('not asked for')) as never,
    metrics: () => '',
  });
  const page = await openReviewPage(own, { desk, tokens: createVerdictTokens() });
  const at = `${page.url()}events/${encodeURIComponent(id)}`;
  // The reviewer's browser outlives the program: a form whose answer never came is sent once more as it was (E12).
  if (existsSync(browserFile)) await expectStatus(403, post(at, readFileSync(browserFile, 'utf8')));
  const shown = await (await fetch(at)).text();
  const isJudged = shown.includes('value="reopen"');
  if (isJudged !== verdicts().length > 0) throw new Error('the page does not say what is on record');
  if (!isJudged) {
    const form = filledIn(shown);
    writeFileSync(browserFile, form);
    await expectStatus(303, post(at, form));
    // Clicked twice: the same verdict, once on record.
    await expectStatus(303, post(at, form));
    if (verdicts().length !== 1) throw new Error('a verdict sent twice stands there twice');
  }
  rmSync(browserFile, { force: true });
  await page.close();
}

/** The verdict form of a page as its reviewer fills it in. */
function filledIn(shown: string): string {
  const hidden = (name: string) => new RegExp(`name="${name}" value="([^"]*)"`).exec(shown)?.[1] ?? '';
  const own = { token: hidden('token'), revision: hidden('revision') };
  return new URLSearchParams({ ...own, verdict: 'accept', by: 'duty', note: 'clear' }).toString();
}

function post(at: string, body: string): Promise<Response> {
  const headers = { Origin: new URL(at).origin, 'Content-Type': 'application/x-www-form-urlencoded' };
  return fetch(`${at}/verdict`, { method: 'POST', redirect: 'manual', headers, body });
}

async function expectStatus(status: number, answer: Promise<Response>): Promise<void> {
  const { status: given } = await answer;
  if (given !== status) throw new Error(`the page answered ${given}, not ${status}`);
}

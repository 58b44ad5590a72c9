import { type ChildProcess, spawn } from 'node:child_process';
import { once } from 'node:events';
import { openSync, readFileSync } from 'node:fs';
import { dirname, extname, join } from 'node:path';
import { setTimeout as pause } from 'node:timers/promises';
import { fileURLToPath } from 'node:url';
import { parseArgs } from 'node:util';
import { freePort } from './demo/freePort.ts';
import { newMail } from './demo/mailbox.ts';
import { makeRunFolder, type RunFolder } from './demo/runFolder.ts';
import { EXIT, OperatorError } from './errors.ts';
import { packageRoot } from './packageRoot.ts';

// What `npm start` runs: the real commands on a copy of the sample feeds. `replay` takes the history in, `watch` is the daemon,
// and this program plays the telescopes: it delivers the last nights one after another.

const LIVE_NIGHTS = 22;
const FIRST_PORT = 8417;
const START_LIMIT_S = 30;
const LOG_LINES_SHOWN = 15;

const TO_EXPECT = `What was planted in these nights (more in sample-feeds/README.md):
  KR 0834-21   a large glitch, recovering in part
  KR 0529+22   a small one, 3.1e-9: it takes nights to show
  KR 1309-12   a step in dispersion
  annex        its clock steps: no pulsar is to blame
  KR 0417+31   one bad session, set aside
  monitor      falls silent; one file has broken rows, one is no table at all
`;

async function main(stop: AbortSignal): Promise<void> {
  const { values } = parseArgs({
    options: { folder: { type: 'string' }, 'seconds-a-night': { type: 'string', default: '1' } },
  });
  const secondsANight = Number(values['seconds-a-night']);
  if (!(secondsANight >= 0)) throw new OperatorError('--seconds-a-night: not a number', { exitCode: EXIT.wrongUsage });

  const port = await freePort(FIRST_PORT);
  const run = makeRunFolder(values.folder ?? join(packageRoot(), '.demo'), join(packageRoot(), 'sample-feeds'), {
    liveNights: LIVE_NIGHTS,
    port,
  });
  say('Kestrel Ridge: an invented observatory with twelve invented pulsars. Nothing here was observed.\n');
  say(`Taking in the nights before ${run.nights[0]} …`);
  await takeHistoryIn(run, stop);
  if (!stop.aborted) await watchNightsArrive(run, { page: `http://127.0.0.1:${port}/`, secondsANight, stop });
  say(`Stopped. What came of it stays in ${run.folder} until the next start.`);
}

/** With its own progress bar, and without mail: old events are no news. */
async function takeHistoryIn(run: RunFolder, stop: AbortSignal): Promise<void> {
  const replay = spinvigil(['replay', ...run.history, '--config', run.configFile], 'inherit', stop);
  const [code] = await once(replay, 'exit');
  if (code !== 0 && !stop.aborted) {
    throw new OperatorError('the history could not be taken in', { exitCode: EXIT.workFailed });
  }
}

interface Showing {
  readonly page: string;
  readonly secondsANight: number;
  readonly stop: AbortSignal;
}

/** The daemon works until it is told to stop; if it ends before, that is an error. */
async function watchNightsArrive(run: RunFolder, { page, secondsANight, stop }: Showing): Promise<void> {
  const daemon = spinvigil(['watch', '--config', run.configFile], openSync(run.logFile, 'a'), stop);
  if (daemon.pid !== undefined) run.claimFor(daemon.pid);
  const ended = once(daemon, 'exit');
  await Promise.race([answers(page), ended]);
  if (daemon.exitCode === null && !stop.aborted) {
    say(`
  review page   ${page}
  mail          ${run.mailFolder} (.eml files)
  log           ${run.logFile}
  stop          Ctrl-C
`);
    say(TO_EXPECT);
    await Promise.race([deliverNights(run, secondsANight, stop), ended]);
  }
  const [code] = await ended;
  if (!stop.aborted || code !== 0) {
    throw new OperatorError(`the daemon ended (${code ?? 'by a signal'}):\n${lastLines(run.logFile)}`, {
      exitCode: EXIT.workFailed,
    });
  }
}

/** The command line beside this file: compiled, or as source under the loader that runs us. */
function spinvigil(args: readonly string[], output: 'inherit' | number, stop: AbortSignal): ChildProcess {
  const here = fileURLToPath(import.meta.url);
  const cli = join(dirname(here), `cli${extname(here)}`);
  // A process group of its own: Ctrl-C reaches it through us, once.
  const child = spawn(process.execPath, [...process.execArgv, cli, ...args], {
    stdio: ['ignore', output, output],
    detached: true,
  });
  stop.addEventListener('abort', () => child.kill('SIGTERM'));
  return child;
}

async function answers(page: string): Promise<void> {
  for (let waitedS = 0; waitedS < START_LIMIT_S; waitedS += 0.2) {
    const answered = await fetch(page).then(
      (response) => response.ok,
      () => false,
    );
    if (answered) return;
    await pause(200);
  }
  throw new OperatorError(`the review page did not answer within ${START_LIMIT_S} s`, { exitCode: EXIT.workFailed });
}

async function deliverNights(run: RunFolder, secondsANight: number, stop: AbortSignal): Promise<void> {
  const arrived = newMail(run.mailFolder);
  const tellMail = () => {
    for (const subject of arrived()) say(`                 mail: ${subject}`);
  };
  for (const night of run.nights) {
    if (stop.aborted) return;
    say(`${night}: ${run.deliver(night).join(', ')}`);
    await pause(secondsANight * 1000);
    tellMail();
  }
  say(`All nights are in. The daemon goes on watching ${run.folder}; stop it with Ctrl-C.`);
  while (!stop.aborted) {
    await pause(500);
    tellMail();
  }
}

function lastLines(file: string): string {
  return readFileSync(file, 'utf8').trimEnd().split('\n').slice(-LOG_LINES_SHOWN).join('\n');
}

function say(line: string): void {
  process.stdout.write(`${line}\n`);
}

const stop = new AbortController();
for (const signal of ['SIGINT', 'SIGTERM', 'SIGHUP'] as const) process.on(signal, () => stop.abort());

try {
  await main(stop.signal);
} catch (error) {
  if (!(error instanceof OperatorError)) throw error;
  process.stderr.write(`${error.message}${error.advice === null ? '' : `; ${error.advice}`}\n`);
  process.exitCode = error.exitCode;
} finally {
  // Whatever happened, nothing of ours goes on running.
  stop.abort();
}

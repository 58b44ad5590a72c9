import {
  copyFileSync,
  cpSync,
  existsSync,
  mkdirSync,
  readdirSync,
  readFileSync,
  renameSync,
  rmSync,
  writeFileSync,
} from 'node:fs';
import { join } from 'node:path';
import { EXIT, OperatorError } from '../errors.ts';

/** The folder that the demo works in: its own copy of the sample feeds, its state, its mail. Made anew for each run. */
export interface RunFolder {
  readonly folder: string;
  readonly configFile: string;
  readonly mailFolder: string;
  readonly logFile: string;
  /** The files laid out from the start, in time order. */
  readonly history: readonly string[];
  /** The dates that are still to come, oldest first. */
  readonly nights: readonly string[];
  /** Puts the files of one night into the feeds, each whole at once; returns the feeds that have one. */
  deliver(night: string): readonly string[];
  /** Notes a process that works in the folder: another run keeps off while it lives. */
  claimFor(pid: number): void;
}

const MARKER = 'made-by-the-demo.json';
const FEEDS = ['main', 'annex', 'monitor'];

/** Throws an `OperatorError` where the folder is not ours to remove, or a run is still at work in it. */
export function makeRunFolder(
  folder: string,
  sampleFeeds: string,
  options: { readonly liveNights: number; readonly port: number },
): RunFolder {
  clearEarlierRun(folder);
  mkdirSync(folder, { recursive: true });
  const pids: number[] = [];
  const claimFor = (pid: number): void => {
    pids.push(pid);
    writeFileSync(join(folder, MARKER), `${JSON.stringify({ pids })}\n`);
  };
  claimFor(process.pid);
  for (const copied of ['models', 'clock'])
    cpSync(join(sampleFeeds, copied), join(folder, copied), { recursive: true });
  for (const made of [...FEEDS, 'staging']) mkdirSync(join(folder, made));
  const configFile = join(folder, 'spinvigil.toml');
  writeFileSync(configFile, runConfiguration(readFileSync(join(sampleFeeds, 'spinvigil.toml'), 'utf8'), options.port));

  const files = FEEDS.flatMap((feed) => readdirSync(join(sampleFeeds, feed)).map((name) => ({ feed, name })));
  const nights = [...new Set(files.map(({ name }) => nightOf(name)))].sort();
  const live = nights.slice(-options.liveNights);
  const history = files.filter(({ name }) => !live.includes(nightOf(name))).sort((a, b) => (a.name < b.name ? -1 : 1));
  for (const { feed, name } of history) copyFileSync(join(sampleFeeds, feed, name), join(folder, feed, name));
  return {
    folder,
    configFile,
    mailFolder: join(folder, 'mail'),
    logFile: join(folder, 'spinvigil.log'),
    history: history.map(({ feed, name }) => join(folder, feed, name)),
    nights: live,
    claimFor,
    deliver(night) {
      const feeds = files.filter(({ name }) => nightOf(name) === night).map(({ feed }) => feed);
      const name = `${night}.csv`;
      for (const feed of feeds) {
        copyFileSync(join(sampleFeeds, feed, name), join(folder, 'staging', name));
        renameSync(join(folder, 'staging', name), join(folder, feed, name));
      }
      return feeds;
    },
  };
}

function nightOf(fileName: string): string {
  return fileName.replace('.csv', '');
}

function clearEarlierRun(folder: string): void {
  if (!existsSync(folder)) return;
  const marker = join(folder, MARKER);
  if (!existsSync(marker)) {
    throw new OperatorError(`${folder} is there and was not made by the demo`, {
      exitCode: EXIT.workFailed,
      advice: 'move it away, then start again',
    });
  }
  const { pids } = JSON.parse(readFileSync(marker, 'utf8')) as { pids: number[] };
  const alive = pids.filter(isAlive);
  if (alive.length > 0) {
    throw new OperatorError(`a demo is still running in ${folder} (process ${alive.join(', ')})`, {
      exitCode: EXIT.anotherInstance,
      advice: `stop it with: kill ${alive.join(' ')}`,
    });
  }
  rmSync(folder, { recursive: true });
}

function isAlive(pid: number): boolean {
  try {
    process.kill(pid, 0);
    return true;
  } catch (error) {
    return (error as NodeJS.ErrnoException).code === 'EPERM';
  }
}

/**
 * The sample feeds' own configuration, with what must differ: state and mail in the run folder, a free port, events of these long past
 * nights mailed as if they were of today, and the feed that falls silent expected every 36 seconds, because silence is told
 * by the wall clock and the demo outruns it.
 */
function runConfiguration(text: string, port: number): string {
  const monitor = 'folder = "monitor"\nlayout = "csv"\nexpect_every_hours = ';
  return [
    ['"../.demo/state"', '"state"'],
    ['"../.demo/mail"', '"mail"'],
    ['"127.0.0.1:8417"', `"127.0.0.1:${port}"`],
    ['digest_cron = ', 'historical_after_days = 100000\ndigest_cron = '],
    [`${monitor}72`, `${monitor}0.01`],
  ].reduce((changed, [from, to]) => {
    if (!changed.includes(from!)) throw new Error(`sample-feeds/spinvigil.toml no longer holds ${from}`);
    return changed.replace(from!, to!);
  }, text);
}

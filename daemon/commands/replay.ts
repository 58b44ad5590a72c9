import { systemClock } from '../clock.ts';
import { EXIT, OperatorError } from '../errors.ts';
import { createLog } from '../log.ts';
import { loadOrders, openRecord } from '../opening.ts';
import { type Replayed, replay as replayArchive } from '../replay.ts';
import { createStation } from '../station.ts';
import { loadTables } from '../tables/loadTables.ts';
import { eventTable } from './events.ts';
import { progressBar } from './progress.ts';
import { printJson, type Terminal } from './terminal.ts';

export interface ReplayCommandOptions {
  readonly config: string;
  readonly feed?: string;
  readonly mail?: boolean;
  readonly json?: boolean;
}

/** `replay`: an archive, offline, through the same pipeline as the watch. Fails when a file could not be read. */
export async function replay(
  terminal: Terminal,
  files: readonly string[],
  options: ReplayCommandOptions,
): Promise<void> {
  const { configuration } = loadOrders(options.config);
  const { tables } = loadTables();
  const store = openRecord(configuration, 'daemon');
  try {
    const log = createLog({ level: 'error', write: (line) => void terminal.err.write(line) });
    const station = createStation({ configuration, store, tables, clock: systemClock, log, reviewUrl: () => null });
    const bars = new Map<string, (done: number) => void>();
    const replayed = await replayArchive(station, {
      files,
      feed: options.feed ?? null,
      mail: options.mail ?? false,
      onProgress(done, total, what) {
        const show = bars.get(what) ?? progressBar(terminal.err, total, what);
        bars.set(what, show);
        show(done);
      },
    });
    const events = store.events();
    if (options.json) printJson(terminal, { ...replayed, events: events.length });
    else terminal.out(`${summary(replayed)}\n\n${eventTable(events)}`);
    if (replayed.unreadable.length > 0) throw unreadable(replayed);
  } finally {
    store.close();
  }
}

function summary({ files, known, rows, newArrivals, quarantined }: Replayed): string {
  const before = known === 0 ? '' : ` (${known} of them on record before)`;
  return `${files} files${before}, ${rows} rows, ${newArrivals} new arrivals, ${quarantined} quarantined`;
}

function unreadable({ unreadable: files }: Replayed): OperatorError {
  const words = files.map(({ file, reason }) => `${file}: ${reason}`).join('\n');
  return new OperatorError(words, { exitCode: EXIT.workFailed });
}

import { mkdtemp, rm } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import type { Clock } from '../../daemon/clock.ts';
import type { Configuration } from '../../daemon/config/configuration.ts';
import { silentLog } from '../../daemon/log.ts';
import { loadOrders } from '../../daemon/opening.ts';
import { Pipeline, type TakeInOptions, type TakenIn } from '../../daemon/pipeline.ts';
import { createStation, type Station } from '../../daemon/station.ts';
import { openStore, type Store } from '../../daemon/store/index.ts';
import { loadTables } from '../../daemon/tables/loadTables.ts';
import { createObservatory, type ObservatoryOptions } from './observatory.ts';

/** The inside of the daemon without its processes: a real record, a real pipeline, a clock that stands where the test puts it. */
export interface TestStation {
  readonly station: Station;
  readonly store: Store;
  readonly pipeline: Pipeline;
  /** Time passes: both clocks go forward. */
  setNow(iso: string): void;
  /** Somebody sets the wall clock. */
  setWallClock(iso: string): void;
  /** Hands a file to the pipeline, as the watcher does. */
  deliver(name: string, content: string, options?: Partial<TakeInOptions>): Promise<TakenIn>;
  /** A new pipeline on the same record, with another configuration if one is given: what a restart does. */
  restart(configuration?: Configuration): TestStation;
  close(): Promise<void>;
}

let tables: ReturnType<typeof loadTables> | null = null;

export async function createTestStation(options: ObservatoryOptions & { readonly now: string }): Promise<TestStation> {
  const observatory = await createObservatory(options);
  const state = await mkdtemp(join(tmpdir(), 'spinvigil-state-'));
  const opened = openStore(state, { mode: 'daemon' });
  if (!opened.ok) throw new Error(opened.failure.message);
  const { configuration } = loadOrders(observatory.configFile);
  const close = async () => {
    opened.store.close();
    await observatory.remove();
    await rm(state, { recursive: true, force: true });
  };
  return testStation(configuration, opened.store, { now: options.now, close });
}

function testStation(
  configuration: Configuration,
  store: Store,
  { now, close }: { now: string; close: () => Promise<void> },
): TestStation {
  let wall = new Date(now);
  let passedMs = 0;
  let deliveries = 0;
  const clock: Clock = { now: () => wall, monotonicMs: () => performance.now() + passedMs };
  tables ??= loadTables();
  const log = silentLog();
  const station = createStation({ configuration, store, tables: tables.tables, clock, log, reviewUrl: () => null });
  const pipeline = new Pipeline(station);
  return {
    station,
    store,
    pipeline,
    setNow(iso) {
      passedMs += Date.parse(iso) - wall.getTime();
      wall = new Date(iso);
    },
    setWallClock(iso) {
      wall = new Date(iso);
    },
    deliver(name, content, options = {}) {
      deliveries += 1;
      // Each delivery at its own time, as in life.
      wall = new Date(wall.getTime() + 1000);
      const file = {
        feed: 'nightly',
        path: name,
        pathBytes: Buffer.from(name),
        bytes: Buffer.from(content),
        signature: `${deliveries} ${now}`,
      };
      return pipeline.takeIn(file, { decide: 'now', mail: false, acceptUnterminated: true, ...options });
    },
    restart: (other = configuration) => testStation(other, store, { now: wall.toISOString(), close }),
    close,
  };
}

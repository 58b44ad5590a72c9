import { type Clock, mjdOf } from './clock.ts';
import type { Configuration } from './config/configuration.ts';
import { programVersion } from './packageRoot.ts';
import type { Progress } from './progress.ts';
import type { HeartbeatSign, VitalSigns } from './review/desk.ts';
import type { Store } from './store/index.ts';
import type { LoadedTables } from './tables/loadTables.ts';
import { tableSigns } from './tables/tableSigns.ts';

/** How the daemon stands in numbers. Cheap: asked at every look of a monitoring system. */
export function vitalSigns(sources: {
  readonly configuration: Configuration;
  readonly store: Store;
  readonly clock: Clock;
  readonly progress: Progress;
  readonly sky: LoadedTables;
  readonly startedAt: Date;
  readonly heartbeats: () => readonly HeartbeatSign[];
}): VitalSigns {
  const { configuration, store, clock, progress, sky } = sources;
  return {
    versions: { program: programVersion(), node: process.versions.node, sqlite: store.sqliteVersion() },
    startedAt: sources.startedAt.toISOString(),
    recordBytes: store.counts().bytes,
    residentBytes: process.memoryUsage.rss(),
    stages: progress.stages().map(({ name, resting, sinceMs, limitMs, late }) => ({
      name,
      resting,
      secondsSinceProgress: sinceMs / 1000,
      limitSeconds: limitMs / 1000,
      late,
    })),
    tables: tableSigns(configuration, sky.tables, mjdOf(clock.now())),
    heartbeats: sources.heartbeats(),
  };
}

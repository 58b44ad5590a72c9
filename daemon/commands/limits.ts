import { power } from '../../alerts/wording/numbers.ts';
import type { DetectionLimit } from '../../detectors/limits/detectionLimit.ts';
import type { NoiseModel } from '../../detectors/report.ts';
import { systemClock } from '../clock.ts';
import type { Configuration } from '../config/configuration.ts';
import { silentLog } from '../log.ts';
import { followPulsar } from '../stages/deviation.ts';
import { PulsarWatches } from '../stages/pulsarWatches.ts';
import { createStation } from '../station.ts';
import type { Store } from '../store/index.ts';
import { loadTables } from '../tables/loadTables.ts';
import { requirePulsar, withRecord } from './record.ts';
import { table } from './table.ts';
import { printJson, type Terminal } from './terminal.ts';

/** One pulsar as `limits --json` prints it. Without a limit, `reason` says why. */
export interface LimitLine {
  readonly pulsar: string;
  /** The smallest Δν/ν that would have been confirmed with 90 % probability. */
  readonly deltaNuOverNu90: number | null;
  /** Days from its epoch to the arrival that confirms it. */
  readonly delayDays90: number | null;
  readonly reason: string | null;
  /** What would have been confirmed sooner, and how long a smaller one would have taken. */
  readonly curve: DetectionLimit['curve'];
  readonly lastArrivalMjd: number | null;
  readonly arrivals: number;
  readonly noise: NoiseModel | null;
}

const NO_CHANGES = { arrivals: [], statusChanges: [], retimed: [] };

/** `limits`: what silence is worth, pulsar by pulsar, the blindest first. */
export async function limits(
  terminal: Terminal,
  { config, pulsar, json }: { readonly config: string; readonly pulsar?: string; readonly json?: boolean },
): Promise<void> {
  const lines = await withRecord(config, (store, configuration) => {
    const known = [...configuration.models.keys()].sort();
    if (pulsar !== undefined) requirePulsar(pulsar, known);
    const wanted = pulsar === undefined ? known : [pulsar];
    return limitLines(store, configuration, wanted).sort(blindestFirst);
  });
  if (json) printJson(terminal, lines);
  else terminal.out(limitText(lines));
}

/** From the record; where an older record has none, worked out now from its arrivals. */
function limitLines(store: Store, configuration: Configuration, pulsars: readonly string[]): LimitLine[] {
  const kept = new Map(store.pulsarReports().map((report) => [report.pulsar, report]));
  const anew = freshLimits(store, configuration);
  return pulsars.map((pulsar) => {
    const report = kept.get(pulsar);
    if (report === undefined) return nothingYet(pulsar);
    const { lastArrivalMjd, noise, limit, arrivals } = report;
    const known = limit === undefined || arrivals === undefined ? anew(pulsar) : { limit, arrivals };
    return { pulsar, ...known.limit, lastArrivalMjd, arrivals: known.arrivals, noise };
  });
}

function freshLimits(
  store: Store,
  configuration: Configuration,
): (pulsar: string) => {
  readonly limit: DetectionLimit;
  readonly arrivals: number;
} {
  const stationOf = () =>
    createStation({
      configuration,
      store,
      tables: loadTables().tables,
      clock: systemClock,
      log: silentLog(),
      reviewUrl: () => null,
    });
  let station: ReturnType<typeof stationOf> | null = null;
  return (pulsar) => {
    station ??= stationOf();
    const { limit, arrivals } = followPulsar(station, new PulsarWatches(), pulsar, NO_CHANGES);
    return { limit, arrivals: arrivals.length };
  };
}

function nothingYet(pulsar: string): LimitLine {
  return {
    pulsar,
    deltaNuOverNu90: null,
    delayDays90: null,
    reason: 'no arrivals yet',
    curve: [],
    lastArrivalMjd: null,
    arrivals: 0,
    noise: null,
  };
}

/** Of the pulsars without a limit nothing would have been seen: they stand before all others. */
function blindestFirst(a: LimitLine, b: LimitLine): number {
  const size = ({ deltaNuOverNu90 }: LimitLine) => deltaNuOverNu90 ?? Number.MAX_VALUE;
  return size(b) - size(a) || (a.pulsar < b.pulsar ? -1 : 1);
}

/** Waits of a night's, a month's and a season's length. */
const WAITS_DAYS = [10, 30, 100];

export function limitText(lines: readonly LimitLine[]): string {
  const soonEnough = ({ curve }: LimitLine, days: number) => curve.findLast((l) => l.delayDays <= days);
  const within = (days: number) => ({
    title: `within ${days} d`,
    align: 'right' as const,
    text: (line: LimitLine) => {
      const found = soonEnough(line, days);
      return found === undefined ? '–' : power(found.deltaNuOverNu90);
    },
  });
  const rows = table(
    lines,
    [
      { title: 'pulsar', text: ({ pulsar }) => pulsar },
      {
        title: 'smallest Δν/ν',
        align: 'right',
        text: ({ deltaNuOverNu90 }) => (deltaNuOverNu90 === null ? 'none' : power(deltaNuOverNu90)),
      },
      {
        title: 'after (d)',
        align: 'right',
        text: ({ delayDays90 }) => (delayDays90 === null ? '–' : delayDays90.toFixed(delayDays90 < 10 ? 1 : 0)),
      },
      ...WAITS_DAYS.map(within),
      { title: 'arrivals', align: 'right', text: ({ arrivals }) => String(arrivals) },
      {
        title: 'last arrival (MJD)',
        align: 'right',
        text: ({ lastArrivalMjd }) => (lastArrivalMjd === null ? '–' : lastArrivalMjd.toFixed(1)),
      },
      { title: '', text: ({ reason }) => reason ?? '' },
    ],
    'No pulsar is configured.',
  );
  const meaning =
    'The smallest step of ν that is confirmed with 90 % probability at the noise and cadence of late, and the days from its epoch to then; larger ones sooner.';
  return lines.length === 0 ? rows : `${rows}\n\n${meaning}`;
}

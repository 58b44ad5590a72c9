import {
  type BelievedStep,
  type CurrentModel,
  currentModel,
  knownSteps,
  openPlan,
  type PulsarTimes,
  type PulsarWatch,
  pulsarTimes,
  report,
  type SiteStep,
} from '../../detectors/index.ts';
import type { PulsarReport } from '../../detectors/report.ts';
import { reasonOf } from '../errors.ts';
import type { Station } from '../station.ts';
import { LEFT_OPEN, type PulsarReportRow, storageTrouble } from '../store/index.ts';
import { GuardedClocks } from './clocks.ts';
import { reportRow } from './decision.ts';
import { type LogChanges, liveLog, modelOf, withSiteSteps } from './deviation.ts';
import { PulsarWatches } from './pulsarWatches.ts';

/**
 * The pulsars and the clocks of their sites. Every pulsar is followed by itself; from what all of them say of the clocks come the
 * steps of the sites; then a pulsar of a site that stepped is followed with the steps known. The steps rest on the pulsars as they
 * look by themselves and on nothing before: so they are the same in whatever order the files came.
 */
export interface Followed {
  readonly reports: readonly PulsarReport[];
  readonly rows: readonly PulsarReportRow[];
  /** Of all sites, in order of time; null: the clocks could not be judged. */
  readonly steps: readonly BelievedStep[] | null;
  /** To fold with, by pulsar; of one that has no arrivals to speak of, none. */
  readonly models: ReadonlyMap<string, CurrentModel>;
}

export interface FollowOptions {
  /** Between two pulsars: the page, the mail and a signal to stop get their turn. */
  readonly pause: () => Promise<void>;
  readonly onPulsar: (done: number) => void;
}

/** The running states of all pulsars: by themselves, and with the steps of their sites. */
export class SiteWatches {
  readonly #alone = new PulsarWatches();
  readonly #withSteps = new PulsarWatches();
  readonly #clocks = new GuardedClocks();
  /** As on record, by pulsar; null: to be read. */
  #times: Map<string, PulsarTimes> | null = null;

  /** After a commit that failed. */
  forget(pulsars: Iterable<string>): void {
    for (const watches of [this.#alone, this.#withSteps]) watches.forget(pulsars);
    this.#times = null;
  }

  async follow(
    station: Station,
    pulsars: readonly string[],
    changes: LogChanges,
    { pause: givePause, onPulsar }: FollowOptions,
  ): Promise<Followed> {
    let ended: unknown = null;
    const pause = () =>
      givePause().catch((error) => {
        ended = error;
        throw error;
      });
    const recorded = new Map(station.store.pulsarReports().map((row) => [row.pulsar, row]));
    this.#times ??= new Map(station.store.pulsarTimes().map((times) => [times.pulsar, times]));
    const times = this.#times;
    const rows = new Map<string, PulsarReportRow>();
    const guarded = async (pulsar: string, work: () => Promise<void>) => {
      await pause();
      try {
        await work();
      } catch (error) {
        if (error === ended || storageTrouble(error) !== null) throw error;
        leaveOpen(station, rows, recorded.get(pulsar), { pulsar, error });
      }
    };
    for (const [i, pulsar] of pulsars.entries()) {
      await guarded(pulsar, async () => {
        const watch = await this.#watch(this.#alone, station, { pulsar, changes, steps: [], pause });
        times.set(pulsar, pulsarTimes(watch));
      });
      onPulsar(i + 1);
    }
    const steps = this.#clocks.judge(station, [...times.values()]);
    const reports: PulsarReport[] = [];
    const models = new Map<string, CurrentModel>();
    const changed = new Set(pulsars.filter((pulsar) => !rows.has(pulsar)));
    for (const [pulsar, own] of times) {
      const before = recorded.get(pulsar)?.siteSteps ?? [];
      const known = steps === null ? before : knownSteps(steps, own);
      if (rows.has(pulsar) || !station.configuration.models.has(pulsar)) continue;
      if (!changed.has(pulsar) && JSON.stringify(known) === JSON.stringify(before)) continue;
      await guarded(pulsar, async () => {
        const watches = known.length === 0 ? this.#alone : this.#withSteps;
        const watch = await this.#watch(watches, station, { pulsar, changes, steps: known, pause });
        const reported = report(watch);
        const { currentModelsFolder } = station.configuration;
        const current = currentModelsFolder === null ? null : currentModel(watch, reported.events);
        if (current !== null) models.set(pulsar, current);
        const plan = openPlan(watch, reported.events);
        reports.push(reported);
        const sessions = changed.has(pulsar) ? { times: own } : {};
        const row = { ...reportRow(station, reported), ...sessions, siteSteps: known };
        rows.set(pulsar, plan === null ? row : { ...row, plan });
      });
    }
    return { reports, rows: [...rows.values()], steps, models };
  }

  #watch(watches: PulsarWatches, station: Station, { pulsar, changes, steps, pause }: Following): Promise<PulsarWatch> {
    const model = modelOf(station, pulsar);
    const log = liveLog(station, pulsar, changes);
    return watches.followInSteps(withSiteSteps(model, steps), station.settingsOf(model), log, pause);
  }
}

interface Following extends Pick<FollowOptions, 'pause'> {
  readonly pulsar: string;
  readonly changes: LogChanges;
  readonly steps: readonly SiteStep[];
}

/** One pulsar that cannot be decided about holds up no other, and loses no arrival: it is tried again at its next arrival and start. */
function leaveOpen(
  station: Station,
  rows: Map<string, PulsarReportRow>,
  before: PulsarReportRow | undefined,
  { pulsar, error }: { readonly pulsar: string; readonly error: unknown },
): void {
  station.log.error({ pulsar, err: error }, 'no decision about this pulsar: a fault of the program');
  if (before !== undefined) rows.set(pulsar, { ...before, basis: `${LEFT_OPEN}: ${reasonOf(error)}` });
}

import {
  type BelievedStep,
  type CurrentModel,
  knownSteps,
  openPlan,
  type PulsarTimes,
  type PulsarWatch,
  pulsarTimes,
  report,
  SiteClocks,
  type SiteStep,
} from '../../detectors/index.ts';
import type { PulsarReport } from '../../detectors/report.ts';
import { reasonOf } from '../errors.ts';
import type { Station } from '../station.ts';
import { type PulsarReportRow, storageTrouble } from '../store/index.ts';
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
  /** Of all sites, in order of time. */
  readonly steps: readonly BelievedStep[];
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
  readonly #clocks = new SiteClocks();
  /** As on record, by pulsar; null: to be read. */
  #times: Map<string, PulsarTimes> | null = null;

  /** The model to fold with, of a pulsar whose report this is; null: it is not followed, or has no arrivals to speak of. */
  currentModel(reported: PulsarReport, siteSteps: readonly SiteStep[]): CurrentModel | null {
    return (siteSteps.length === 0 ? this.#alone : this.#withSteps).currentModel(reported);
  }

  /** After a commit that failed. */
  forget(pulsars: Iterable<string>): void {
    for (const watches of [this.#alone, this.#withSteps]) watches.forget(pulsars);
    this.#times = null;
  }

  async follow(
    station: Station,
    pulsars: readonly string[],
    changes: LogChanges,
    { pause, onPulsar }: FollowOptions,
  ): Promise<Followed> {
    const recorded = new Map(station.store.pulsarReports().map((row) => [row.pulsar, row]));
    this.#times ??= new Map(station.store.pulsarTimes().map((times) => [times.pulsar, times]));
    const times = this.#times;
    const rows = new Map<string, PulsarReportRow>();
    const guarded = (pulsar: string, work: () => void) => {
      try {
        work();
      } catch (error) {
        if (storageTrouble(error) !== null) throw error;
        leaveOpen(station, rows, recorded.get(pulsar), { pulsar, error });
      }
    };
    for (const [i, pulsar] of pulsars.entries()) {
      await pause();
      guarded(pulsar, () => {
        times.set(pulsar, pulsarTimes(this.#watch(this.#alone, station, { pulsar, changes, steps: [] })));
      });
      onPulsar(i + 1);
    }
    const steps = this.#clocks.steps([...times.values()]);
    const reports: PulsarReport[] = [];
    const changed = new Set(pulsars.filter((pulsar) => !rows.has(pulsar)));
    for (const [pulsar, own] of times) {
      const known = knownSteps(steps, own);
      const before = recorded.get(pulsar)?.siteSteps ?? [];
      if (rows.has(pulsar) || !station.configuration.models.has(pulsar)) continue;
      if (!changed.has(pulsar) && JSON.stringify(known) === JSON.stringify(before)) continue;
      await pause();
      guarded(pulsar, () => {
        const watches = known.length === 0 ? this.#alone : this.#withSteps;
        const watch = this.#watch(watches, station, { pulsar, changes, steps: known });
        const reported = report(watch);
        const plan = openPlan(watch, reported.events);
        reports.push(reported);
        const sessions = changed.has(pulsar) ? { times: own } : {};
        const row = { ...reportRow(station, reported), ...sessions, siteSteps: known };
        rows.set(pulsar, plan === null ? row : { ...row, plan });
      });
    }
    return { reports, rows: [...rows.values()], steps };
  }

  #watch(
    watches: PulsarWatches,
    station: Station,
    {
      pulsar,
      changes,
      steps,
    }: { readonly pulsar: string; readonly changes: LogChanges; readonly steps: readonly SiteStep[] },
  ): PulsarWatch {
    const model = modelOf(station, pulsar);
    return watches.follow(withSiteSteps(model, steps), station.settingsOf(model), liveLog(station, pulsar, changes));
  }
}

/** One pulsar that cannot be decided about holds up no other, and loses no arrival: it is tried again at its next arrival and start. */
function leaveOpen(
  station: Station,
  rows: Map<string, PulsarReportRow>,
  before: PulsarReportRow | undefined,
  { pulsar, error }: { readonly pulsar: string; readonly error: unknown },
): void {
  station.log.error({ pulsar, err: error }, 'no decision about this pulsar: a fault of the program');
  if (before !== undefined) rows.set(pulsar, { ...before, basis: `left open: ${reasonOf(error)}` });
}

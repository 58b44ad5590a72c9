import { getHeapStatistics } from 'node:v8';
import type { TimedArrival } from '../../detectors/arrival.ts';
import { advance, type PulsarWatch, report, startWatch } from '../../detectors/index.ts';
import type { DetectorSettings, PulsarReport } from '../../detectors/report.ts';
import type { PulsarModel } from '../../detectors/spin/pulsarModel.ts';
import { compareMjd } from '../../detectors/time/mjd.ts';

/**
 * The detector's running state of each pulsar, kept in memory and never the truth: whatever is here can be thrown away and folded anew
 * from the arrival log. An arrival later than all before it is folded in; anything else (a late file, a revised row) starts the
 * pulsar over, which is why the order in which files come in cannot change an event.
 */
export class PulsarWatches {
  readonly #watches = new Map<string, Running>();
  readonly #most: number;

  constructor(options: { readonly most: number } = { most: MOST_WATCHES }) {
    this.#most = options.most;
  }

  /**
   * The detector's report on a pulsar.
   * @param log its live arrivals in time order (`inTimeOrder`), the new ones among them
   */
  report(model: PulsarModel, settings: DetectorSettings, log: readonly TimedArrival[]): PulsarReport {
    return report(this.follow(model, settings, log));
  }

  /** The watch over a pulsar, up to date with its log. */
  follow(model: PulsarModel, settings: DetectorSettings, log: readonly TimedArrival[]): PulsarWatch {
    const running = this.#resume(model, settings, log);
    while (running.taken.length < log.length) takeIn(running, log[running.taken.length]!);
    this.#remember(model.name, running);
    return running.watch;
  }

  /** The same in small steps: a long log takes seconds. What `pause` throws ends it, and the pulsar starts over the next time. */
  async followInSteps(
    model: PulsarModel,
    settings: DetectorSettings,
    log: readonly TimedArrival[],
    pause: () => Promise<void>,
  ): Promise<PulsarWatch> {
    const running = this.#resume(model, settings, log);
    for (let step = 1; running.taken.length < log.length; step++) {
      if (step % ARRIVALS_A_STEP === 0) await pause();
      takeIn(running, log[running.taken.length]!);
    }
    this.#remember(model.name, running);
    return running.watch;
  }

  /** After a commit that failed: what is in memory may be ahead of the log. */
  forget(pulsars: Iterable<string>): void {
    for (const pulsar of pulsars) this.#watches.delete(pulsar);
  }

  #resume(model: PulsarModel, settings: DetectorSettings, log: readonly TimedArrival[]): Running {
    const running = this.#watches.get(model.name);
    // Taken out while in use: a throw in the detector leaves nothing half-advanced behind.
    this.#watches.delete(model.name);
    if (
      running !== undefined &&
      isSameModel(running.model, model) &&
      running.settings === settings &&
      startsWith(log, running.taken)
    ) {
      return running;
    }
    return { model, settings, watch: startWatch(model, settings), taken: [] };
  }

  #remember(pulsar: string, running: Running): void {
    this.#watches.set(pulsar, running);
    if (this.#watches.size <= this.#most) return;
    const [longestUnused] = this.#watches.keys();
    if (longestUnused !== undefined) this.#watches.delete(longestUnused);
  }
}

/** A running watch takes up to so much (measured: 3 MB, and 0.3 kB an arrival). */
const WATCH_BYTES = 5e6;
const LEAST_WATCHES = 50;
/** Those of all pulsars may take an eighth of what the engine may use. The others are folded anew when something comes in for them. */
const MOST_WATCHES = Math.max(LEAST_WATCHES, Math.floor(getHeapStatistics().heap_size_limit / 8 / WATCH_BYTES));
/** Some tens of milliseconds. */
const ARRIVALS_A_STEP = 20;

interface Running {
  readonly model: PulsarModel;
  readonly settings: DetectorSettings;
  readonly watch: PulsarWatch;
  /** Keys of the arrivals folded in so far, in order. A key is an arrival's content, so equal keys are equal arrivals. */
  readonly taken: string[];
}

function takeIn({ watch, taken }: Running, arrival: TimedArrival): void {
  advance(watch, arrival);
  taken.push(arrival.key);
}

/** The operator's model with the same steps of the sites' clocks. */
function isSameModel(a: PulsarModel, b: PulsarModel): boolean {
  if (a === b) return true;
  const { siteSteps: stepsOfA, ...restOfA } = a;
  const { siteSteps: stepsOfB, ...restOfB } = b;
  return JSON.stringify(stepsOfA) === JSON.stringify(stepsOfB) && JSON.stringify(restOfA) === JSON.stringify(restOfB);
}

function startsWith(log: readonly TimedArrival[], taken: readonly string[]): boolean {
  if (taken.length > log.length) return false;
  return taken.every((key, i) => log[i]!.key === key);
}

/** The order in which the detector sees arrivals: barycentric time, and for equal times the key, so that it is always the same one. */
export function inTimeOrder(arrivals: readonly TimedArrival[]): readonly TimedArrival[] {
  return [...arrivals].sort((a, b) => compareMjd(a.tdb, b.tdb) || (a.key < b.key ? -1 : a.key > b.key ? 1 : 0));
}

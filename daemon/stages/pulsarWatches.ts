import type { TimedArrival } from '../../detectors/arrival.ts';
import {
  advance,
  type CurrentModel,
  currentModel,
  type PulsarWatch,
  report,
  startWatch,
} from '../../detectors/index.ts';
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

  constructor(options: { readonly most: number } = { most: 2000 }) {
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
    for (let i = running.taken.length; i < log.length; i++) {
      const arrival = log[i]!;
      advance(running.watch, arrival);
      running.taken.push(arrival.key);
    }
    this.#remember(model.name, running);
    return running.watch;
  }

  /** The model to fold with, of a pulsar whose report this is; null: it is not followed, or has no arrivals to speak of. */
  currentModel({ pulsar, events }: Pick<PulsarReport, 'pulsar' | 'events'>): CurrentModel | null {
    const running = this.#watches.get(pulsar);
    return running === undefined ? null : currentModel(running.watch, events);
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

interface Running {
  readonly model: PulsarModel;
  readonly settings: DetectorSettings;
  readonly watch: PulsarWatch;
  /** Keys of the arrivals folded in so far, in order. A key is an arrival's content, so equal keys are equal arrivals. */
  readonly taken: string[];
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

import { type BelievedStep, type PulsarTimes, SiteClocks } from '../../detectors/index.ts';
import { reasonOf } from '../errors.ts';
import type { Station } from '../station.ts';
import type { Store } from '../store/index.ts';

/** Why the clocks of the sites could not be judged when that was tried last. */
const CLOCKS_FAULT = 'clocks_not_judged';
const NONE = '';

/** Null: they were judged. */
export function clocksFault(store: Pick<Store, 'meta'>): string | null {
  return store.meta(CLOCKS_FAULT) || null;
}

/** The clocks of all sites. That they cannot be judged holds up the decision about no pulsar: it is noted, for health and the operators. */
export class GuardedClocks {
  #clocks = new SiteClocks();

  /** Null: by a fault of the program they cannot be judged; what is on record of them stands. */
  judge({ store, log }: Pick<Station, 'store' | 'log'>, times: readonly PulsarTimes[]): readonly BelievedStep[] | null {
    try {
      const steps = this.#clocks.steps(times);
      note(store, NONE);
      return steps;
    } catch (error) {
      log.error({ err: error }, 'the clocks of the sites could not be judged: a fault of the program');
      // What it had kept may be half of the old and half of the new.
      this.#clocks = new SiteClocks();
      note(store, reasonOf(error));
      return null;
    }
  }
}

function note(store: Pick<Store, 'meta' | 'setMeta'>, fault: string): void {
  if ((store.meta(CLOCKS_FAULT) ?? NONE) !== fault) store.setMeta(CLOCKS_FAULT, fault);
}

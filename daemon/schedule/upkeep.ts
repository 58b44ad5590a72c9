import { clockStepWatch } from '../clock.ts';
import type { Stage } from '../progress.ts';
import type { Station } from '../station.ts';
import { storageTrouble } from '../store/index.ts';
import { createDailyChecks } from './dailyChecks.ts';
import { type Loop, startLoop } from './loop.ts';
import { createSelfAlerts } from './selfAlerts.ts';
import { FIRST_START, reportSilences } from './silentFeeds.ts';

/** Once a minute: feeds that fell silent, other trouble with the watch itself, a wall clock that was set, a record that was moved away under the running program. Once a day: `dailyChecks`. */
export function startUpkeep(
  station: Station,
  actions: {
    readonly onMail: () => void;
    readonly onClockStep: () => Promise<void>;
    readonly tableWarnings: () => readonly string[];
    readonly onFatal: (error: unknown) => void;
    readonly stage: Stage;
  },
): Loop {
  const { store, clock, log } = station;
  if (store.meta(FIRST_START) === null) store.setMeta(FIRST_START, clock.now().toISOString());
  const clockStep = clockStepWatch(clock);
  const daily = createDailyChecks(station, actions.tableWarnings);
  const selfAlerts = createSelfAlerts(station);
  return startLoop({
    name: 'upkeep',
    pauseMs: UPKEEP_MS,
    log,
    stage: actions.stage,
    async work() {
      if (!store.isInPlace()) {
        actions.onFatal(new Error(`the record in ${station.configuration.stateFolder} was moved, removed or replaced`));
        return;
      }
      const stepS = clockStep();
      if (stepS !== null) {
        log.warn({ seconds: Math.round(stepS) }, 'the wall clock was set, or the machine slept');
        store.setMeta(CLOCK_STEPPED, JSON.stringify({ at: clock.now().toISOString(), seconds: Math.round(stepS) }));
        await actions.onClockStep();
      }
      if ((await reportSilences(station)) + (await selfAlerts.run()) > 0) actions.onMail();
      try {
        if ((await daily.run()) > 0) actions.onMail();
      } catch (error) {
        const trouble = storageTrouble(error);
        if (trouble === 'fault' || trouble === 'damaged') actions.onFatal(error);
        throw error;
      }
    },
  });
}

const UPKEEP_MS = 60_000;
/** The daily check of a large record takes minutes. */
export const UPKEEP_LIMIT_MS = 1_200_000;
const CLOCK_STEPPED = 'clock_stepped';
const REMEMBERED_MS = 86_400_000;

/** For the morning review: a step of the wall clock within the last day. */
export function clockStepWarnings({ store, clock }: Pick<Station, 'store' | 'clock'>): string[] {
  const stepped = store.meta(CLOCK_STEPPED);
  if (stepped === null) return [];
  const { at, seconds } = JSON.parse(stepped) as { at: string; seconds: number };
  if (clock.now().getTime() - Date.parse(at) > REMEMBERED_MS) return [];
  return [
    `the wall clock went ${Math.abs(seconds)} s ${seconds > 0 ? 'forward' : 'back'} at ${at}: it was set, or the machine slept`,
  ];
}

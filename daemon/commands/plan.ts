import { planText } from '../../alerts/wording/plan.ts';
import { advance, planFor, startWatch } from '../../detectors/index.ts';
import { mjdOf, systemClock } from '../clock.ts';
import { silentLog } from '../log.ts';
import { liveLog, modelInUse } from '../stages/deviation.ts';
import { createStation } from '../station.ts';
import { loadTables } from '../tables/loadTables.ts';
import { requirePulsar, withRecord } from './record.ts';
import { printJson, type Terminal } from './terminal.ts';

const NO_CHANGES = { arrivals: [], statusChanges: [], retimed: [] };

/** `plan`: when to observe a pulsar next, and what that would settle. It reads the record and changes nothing. */
export async function plan(
  terminal: Terminal,
  pulsar: string,
  options: { readonly config: string; readonly json?: boolean },
): Promise<void> {
  const { tables } = loadTables();
  await withRecord(options.config, (store, configuration) => {
    requirePulsar(pulsar, [...configuration.models.keys()].sort());
    const parts = { configuration, store, tables, clock: systemClock, log: silentLog(), reviewUrl: () => null };
    const station = createStation(parts);
    const model = configuration.models.get(pulsar)!;
    const watch = startWatch(modelInUse(station, pulsar), station.settingsOf(model));
    for (const arrival of liveLog(station, pulsar, NO_CHANGES)) advance(watch, arrival);
    const events = store.events({ pulsar }).map(({ event }) => event);
    const made = planFor(watch, events, mjdOf(systemClock.now()));
    if (options.json) printJson(terminal, made);
    else terminal.out(planText(made, configuration.mail.timezone));
  });
}

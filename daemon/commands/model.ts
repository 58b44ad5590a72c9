import { basename, dirname, resolve } from 'node:path';
import { eventName, writeWhole } from '../../alerts/index.ts';
import type { PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import { systemClock } from '../clock.ts';
import { EXIT, OperatorError, reasonOf } from '../errors.ts';
import { silentLog } from '../log.ts';
import { modelJson, modelToml } from '../modelForms.ts';
import { modelOfDate } from '../stages/currentModels.ts';
import { createStation } from '../station.ts';
import type { Store } from '../store/index.ts';
import { loadTables } from '../tables/loadTables.ts';
import { mjdFrom } from './events.ts';
import { requireModel, withRecord } from './record.ts';
import type { Terminal } from './terminal.ts';

/** `model`: the spin-down model to fold with, now or at an earlier date, as a file of the models folder or as JSON. */
export async function model(
  terminal: Terminal,
  pulsar: string,
  options: { readonly config: string; readonly at?: string; readonly to?: string; readonly json?: boolean },
): Promise<void> {
  const atMjd = options.at === undefined ? null : mjdFrom(options.at);
  const { tables } = loadTables();
  await withRecord(options.config, async (store, configuration) => {
    const start = requireModel(pulsar, configuration);
    const parts = { configuration, store, tables, clock: systemClock, log: silentLog(), reviewUrl: () => null };
    const found = modelOfDate(createStation(parts), start, atMjd);
    if (found === null) {
      const when = atMjd === null ? '' : ` by MJD ${atMjd.toFixed(2)}`;
      throw new OperatorError(
        `${pulsar} has no arrivals on record${when}: its model is still the one in the models folder`,
        {
          exitCode: EXIT.workFailed,
          advice: `spinvigil arrivals "${pulsar}" lists what there is`,
        },
      );
    }
    const events = found.events.map((event) => ({ ...called(store, event), epochMjd: event.epochMjd }));
    const json = { at: atMjd, ...(modelJson(found.current, events) as object) };
    const text = options.json ? `${JSON.stringify(json, null, 2)}\n` : modelToml(found.current, events);
    if (options.to === undefined) terminal.out(text);
    else await writeTo(resolve(options.to), text);
  });
}

async function writeTo(file: string, text: string): Promise<void> {
  try {
    await writeWhole(dirname(file), basename(file), text, 0o644);
  } catch (error) {
    throw new OperatorError(`${file} cannot be written: ${reasonOf(error)}`, { exitCode: EXIT.workFailed });
  }
}

/** An event as it is called today: a verdict stands on record only. */
function called(store: Store, event: PulsarEvent): { readonly id: string; readonly name: string } {
  const record = store.event(event.id);
  return { id: record?.event.id ?? event.id, name: eventName(record?.event ?? event) };
}

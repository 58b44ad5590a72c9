import type { PulsarModel } from '../../detectors/spin/pulsarModel.ts';
import { closestName } from '../closestName.ts';
import type { Configuration } from '../config/configuration.ts';
import { EXIT, OperatorError } from '../errors.ts';
import { loadOrders, openRecord } from '../opening.ts';
import type { EventRecord } from '../records.ts';
import type { Store } from '../store/index.ts';

/** Runs a command beside a daemon, or without one: it looks at the record, and may give a verdict. */
export async function withRecord<Result>(
  configFile: string,
  work: (store: Store, configuration: Configuration) => Result | Promise<Result>,
): Promise<Result> {
  const { configuration } = loadOrders(configFile);
  const store = openRecord(configuration, 'reader');
  try {
    return await work(store, configuration);
  } finally {
    store.close();
  }
}

/** A name mistyped must not look like silence. */
export function requirePulsar(name: string, known: readonly string[]): void {
  if (known.includes(name)) return;
  const near = closestName(name, known);
  throw new OperatorError(`there is no pulsar ${name}${near === null ? '' : ` (did you mean ${near}?)`}`, {
    exitCode: EXIT.wrongUsage,
  });
}

/** The start model of a pulsar. */
export function requireModel(pulsar: string, { models, modelsFolder }: Configuration): PulsarModel {
  const model = models.get(pulsar);
  if (model !== undefined) return model;
  const near = closestName(pulsar, [...models.keys()]);
  throw new OperatorError(`there is no model of ${pulsar}${near === null ? '' : ` (did you mean ${near}?)`}`, {
    exitCode: EXIT.wrongUsage,
    advice: `models stand in ${modelsFolder}`,
  });
}

/** The event of an id, or of one it had before. */
export function eventOf(store: Store, id: string): EventRecord {
  const record = store.event(id);
  if (record !== null) return record;
  throw new OperatorError(`there is no event ${id}`, {
    exitCode: EXIT.workFailed,
    advice: 'spinvigil events lists them',
  });
}

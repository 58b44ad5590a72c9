import { createHash } from 'node:crypto';
import { mkdir } from 'node:fs/promises';
import { eventName, safeFileName, writeWhole } from '../../alerts/index.ts';
import type { CurrentModel } from '../../detectors/index.ts';
import type { PulsarReport } from '../../detectors/report.ts';
import { reasonOf } from '../errors.ts';
import { modelJson, modelToml } from '../modelForms.ts';
import type { Station } from '../station.ts';
import type { Followed } from './sites.ts';

/**
 * Writes the current models of pulsars that were decided about into the operator's folder, for whoever folds: one file as the models
 * folder has them, and one JSON. After the record, never before it; what goes wrong with it stops nothing else.
 */
export async function writeCurrentModels(
  station: Station,
  { reports, models }: Pick<Followed, 'reports' | 'models'>,
): Promise<void> {
  const folder = station.configuration.currentModelsFolder;
  if (folder === null) return;
  for (const report of reports) {
    try {
      const current = models.get(report.pulsar);
      // Before the count is certain, the model of the models folder is the better one.
      if (current?.locked) await writeModel(station, folder, current, report);
    } catch (error) {
      station.log.error(
        { pulsar: report.pulsar, folder, reason: reasonOf(error) },
        'the current model was not written',
      );
    }
  }
}

async function writeModel(
  { configuration }: Station,
  folder: string,
  current: CurrentModel,
  { pulsar, events }: PulsarReport,
): Promise<void> {
  const held = events
    .filter(({ id }) => current.events.includes(id))
    .map((event) => ({ id: event.id, name: eventName(event), epochMjd: event.epochMjd }));
  const name = modelFileName(pulsar, [...configuration.models.keys()]);
  await mkdir(folder, { recursive: true });
  await writeWhole(folder, `${name}.toml`, modelToml(current, held), FOR_ALL_TO_READ);
  await writeWhole(folder, `${name}.json`, `${JSON.stringify(modelJson(current, held), null, 2)}\n`, FOR_ALL_TO_READ);
}

const FOR_ALL_TO_READ = 0o644;

/** The pulsar's name as a file name; with a digest where two names would share one. */
export function modelFileName(pulsar: string, all: readonly string[]): string {
  const plain = safeFileName(pulsar);
  if (all.every((other) => other === pulsar || safeFileName(other) !== plain)) return plain;
  return `${plain}-${createHash('sha256').update(pulsar).digest('hex').slice(0, 8)}`;
}

import type { DeclaredOffset } from '../../detectors/spin/pulsarModel.ts';
import { receiverTable } from './pulsarSchema.ts';
import type { SectionReader } from './sectionReader.ts';
import type { TomlPath } from './tomlDocument.ts';

/** The [[receiver]] tables of a pulsar's file; null after complaints. */
export function readReceivers(reader: SectionReader): DeclaredOffset[] | null {
  const paths = reader.tablesOf(['receiver']);
  const receivers = paths.map((path) => readReceiver(reader, path));
  if (receivers.some((receiver) => receiver === null)) return null;
  const seen = new Set<string>();
  for (const [i, receiver] of (receivers as DeclaredOffset[]).entries()) {
    const key = JSON.stringify([receiver.receiver, receiver.site ?? null]);
    if (seen.has(key)) {
      reader.error([...paths[i]!, 'name'], 'is declared twice: the offset of a receiver at a site can be only one');
      return null;
    }
    seen.add(key);
  }
  return receivers as DeclaredOffset[];
}

function readReceiver(reader: SectionReader, path: TomlPath): DeclaredOffset | null {
  const table = reader.read(path, receiverTable);
  if (table === null) return null;
  return {
    receiver: table.name,
    ...(table.site === undefined ? {} : { site: table.site }),
    offsetUs: table.offset_us,
    uncertaintyUs: table.uncertainty_us,
  };
}

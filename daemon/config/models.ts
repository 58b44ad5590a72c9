import { readdirSync } from 'node:fs';
import { join } from 'node:path';
import { BUILT_IN_EPHEMERIS, type PulsarModel } from '../../detectors/spin/pulsarModel.ts';
import type { KernelShelf } from '../tables/kernelFile.ts';
import type { ConfigProblem } from './configuration.ts';
import { readPulsarFile } from './pulsarFile.ts';
import { createSectionReader } from './sectionReader.ts';
import { readTextFile } from './textFile.ts';
import { isFault, parseToml } from './tomlDocument.ts';

/**
 * Every pulsar's file of the models folder, in the order of the file names, with the kernels they name. Hidden files and other endings
 * are passed over.
 */
export function loadModels(folder: string, shelf: KernelShelf, problems: ConfigProblem[]): Map<string, PulsarModel> {
  const models = new Map<string, PulsarModel>();
  const fileOf = new Map<string, string>();
  const complain = (file: string, message: string, place?: { line: number; column: number }) =>
    problems.push({ file, line: place?.line ?? null, column: place?.column ?? null, message, severity: 'error' });

  for (const file of modelFiles(folder, complain)) {
    const read = readTextFile(file);
    if ('problem' in read) {
      complain(file, read.problem);
      continue;
    }
    const document = parseToml(read.text);
    if (isFault(document)) {
      complain(file, document.message, document);
      continue;
    }
    const model = readPulsarFile(createSectionReader(file, document, problems));
    if (model === null) continue;
    const earlier = fileOf.get(model.name);
    if (earlier !== undefined) {
      complain(file, `name: "${model.name}" has a model already, in ${earlier}`, document.placeOf(['name']));
      continue;
    }
    const kernel = kernelProblem(model, shelf);
    if (kernel !== null) complain(file, kernel, document.placeOf(['spin', 'ephemeris']));
    fileOf.set(model.name, file);
    models.set(model.name, model);
  }
  return models;
}

function kernelProblem({ ephemeris }: PulsarModel, shelf: KernelShelf): string | null {
  if (ephemeris === undefined || ephemeris === BUILT_IN_EPHEMERIS) return null;
  const taken = shelf.take(ephemeris);
  if ('kernel' in taken) return null;
  return `spin, ephemeris: ${ephemeris} ${taken.problem}; write "${BUILT_IN_EPHEMERIS}" or the path of an SPK kernel`;
}

function modelFiles(folder: string, complain: (file: string, message: string) => void): string[] {
  let names: string[];
  try {
    names = readdirSync(folder);
  } catch (error) {
    complain(folder, `the models folder cannot be read (${(error as NodeJS.ErrnoException).code ?? error})`);
    return [];
  }
  const files = names
    .filter((file) => file.endsWith('.toml') && !file.startsWith('.'))
    .sort()
    .map((file) => join(folder, file));
  if (files.length === 0)
    complain(folder, 'there is no pulsar model here: one file a pulsar, its name ending in .toml');
  return files;
}

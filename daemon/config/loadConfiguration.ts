import { dirname, resolve } from 'node:path';
import { createKernelShelf } from '../tables/kernelFile.ts';
import type { ConfigProblem, Configuration, Feed, MailSettings, Site } from './configuration.ts';
import { readEarth } from './earth.ts';
import { readFeeds } from './feeds.ts';
import { checkOverlaps, checkStateFolder, type NamedFolder } from './folders.ts';
import { readHeartbeat } from './heartbeatSettings.ts';
import { checkNamedPulsars, readMail, type Surroundings } from './mailSettings.ts';
import { loadModels } from './models.ts';
import { readReview } from './reviewSettings.ts';
import { createSectionReader, type SectionReader } from './sectionReader.ts';
import { budgetTable, modelsTable, observatoryTable, rootTable, stateTable } from './sections.ts';
import { readSites } from './sites.ts';
import { readTextFile } from './textFile.ts';
import { isFault, parseToml } from './tomlDocument.ts';

export interface LoadedConfiguration {
  /** Null exactly when one of the problems is an error. */
  readonly configuration: Configuration | null;
  readonly problems: readonly ConfigProblem[];
}

/**
 * Reads the configuration with everything it names: models, clock tables, folders, the password file. All that is wrong is
 * reported at once, each with its place. Relative paths start from the configuration file's folder. Nothing is written.
 */
export function loadConfiguration(
  file: string,
  { environment = process.env }: { readonly environment?: NodeJS.ProcessEnv } = {},
): LoadedConfiguration {
  const path = resolve(file);
  const read = readTextFile(path);
  if ('problem' in read) return unreadable(path, read.problem);
  const document = parseToml(read.text);
  if (isFault(document)) return unreadable(path, document.message, document);

  const problems: ConfigProblem[] = [];
  const reader = createSectionReader(path, document, problems);
  const around: Surroundings = { absolute: (name) => resolve(dirname(path), name), environment };
  const parts = readParts(reader, around, problems);
  const faulty = problems.some(({ severity }) => severity === 'error');
  return { configuration: faulty ? null : assemble(path, parts), problems };
}

function unreadable(file: string, message: string, place?: { line: number; column: number }): LoadedConfiguration {
  const problem: ConfigProblem = {
    file,
    line: place?.line ?? null,
    column: place?.column ?? null,
    message,
    severity: 'error',
  };
  return { configuration: null, problems: [problem] };
}

type Parts = ReturnType<typeof readParts>;

function readParts(reader: SectionReader, around: Surroundings, problems: ConfigProblem[]) {
  reader.read([], rootTable);
  const observatory = reader.read(['observatory'], observatoryTable);
  const state = reader.read(['state'], stateTable);
  const shelf = createKernelShelf();
  const earth = readEarth(reader, around, shelf, problems);
  const sites = readSites(reader, around, problems);
  const feeds = readFeeds(
    reader,
    around,
    sites.flatMap((site) => site?.name ?? []),
  );
  const modelsSection = reader.read(['models'], modelsTable);
  const budget = reader.read(['budget'], budgetTable);
  const mail = readMail(reader, around);

  const stateFolder = state && around.absolute(state.folder);
  if (stateFolder !== null)
    checkStateFolder(reader, { title: 'the state folder', path: ['state', 'folder'], folder: stateFolder });
  const review = readReview(reader, around, stateFolder);
  const heartbeat = readHeartbeat(reader);
  const modelsFolder = modelsSection && around.absolute(modelsSection.folder);
  const writeFolder = modelsSection?.write_folder;
  const currentModelsFolder = writeFolder === undefined ? null : around.absolute(writeFolder);
  const others = otherFolders({ stateFolder, modelsFolder, mail, file: reader.file });
  const written = currentModels(currentModelsFolder);
  checkOverlaps(reader, feedFolders(feeds), [...others, ...written]);
  checkOverlaps(reader, written, others);
  const models = modelsFolder === null ? null : loadModels(modelsFolder, shelf, problems);
  checkNamedPulsars(reader, mail, models);
  const folders = { stateFolder, modelsFolder, currentModelsFolder };
  return { observatory, ...folders, earth, sites, feeds, models, budget, mail, review, heartbeat };
}

function assemble(file: string, parts: Parts): Configuration {
  return {
    file,
    observatory: sound(parts.observatory),
    stateFolder: sound(parts.stateFolder),
    earth: parts.earth,
    sites: parts.sites.map(sound<Site>),
    feeds: parts.feeds.map(sound<Feed>),
    modelsFolder: sound(parts.modelsFolder),
    currentModelsFolder: parts.currentModelsFolder,
    models: sound(parts.models),
    budget: { falseAlertsPerYear: sound(parts.budget).false_alerts_per_year },
    mail: sound<MailSettings>(parts.mail),
    review: sound(parts.review),
    heartbeat: sound(parts.heartbeat),
  };
}

/** A part is missing only after a complaint, and after an error nothing is assembled. */
function sound<Part>(part: Part | null): Part {
  if (part === null) throw new Error('a part of the configuration is missing although no error was reported');
  return part;
}

function feedFolders(feeds: readonly (Feed | null)[]): NamedFolder[] {
  return feeds.flatMap((feed, index) =>
    feed === null ? [] : [{ title: `feed "${feed.name}"`, path: ['feed', index, 'folder'], folder: feed.folder }],
  );
}

/** Models that we write are not models that we read: else the program would follow itself. */
function currentModels(folder: string | null): NamedFolder[] {
  const title = 'the folder of current models';
  return folder === null ? [] : [{ title, path: ['models', 'write_folder'], folder }];
}

function otherFolders(parts: {
  readonly stateFolder: string | null;
  readonly modelsFolder: string | null;
  readonly mail: MailSettings | null;
  readonly file: string;
}): NamedFolder[] {
  const folders: NamedFolder[] = [{ title: 'the configuration file', path: [], folder: parts.file }];
  const { stateFolder, modelsFolder, mail } = parts;
  if (stateFolder !== null) folders.push({ title: 'the state folder', path: ['state', 'folder'], folder: stateFolder });
  if (modelsFolder !== null)
    folders.push({ title: 'the models folder', path: ['models', 'folder'], folder: modelsFolder });
  if (mail?.transport.kind === 'folder') {
    folders.push({ title: 'the mail folder', path: ['mail', 'folder'], folder: mail.transport.folder });
  }
  return folders;
}

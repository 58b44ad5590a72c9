import { mkdirSync, rmSync, writeFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { loadTables } from '../daemon/tables/loadTables.ts';
import { expectedAnswers } from './making/expected.ts';
import { feedFiles, type MadeFile } from './making/feedFiles.ts';
import { FEEDS, SITES, type SiteName } from './making/observatory.ts';
import { observe } from './making/observing.ts';
import { PULSARS } from './making/pulsars.ts';
import { clockTable, clockTableText } from './making/siteClock.ts';
import { startModel } from './making/startModel.ts';
import { truthOf } from './making/truth.ts';

// Makes the sample feeds anew: `npx tsx sample-feeds/generate.ts`. What is planted stands in making/happenings.ts.

/** Every file but the configuration, which is written by hand. The same on every machine and day, to 1e-13 d. */
export function madeFiles(): MadeFile[] {
  const sites = Object.keys(SITES) as SiteName[];
  const { tables } = loadTables({ hostLeapSecondFiles: [] });
  const clocks = new Map(sites.map((site) => [site, clockTable(site)]));
  return [
    ...PULSARS.map((pulsar) => ({
      path: `models/${fileName(pulsar.name)}`,
      content: startModel(pulsar, truthOf(pulsar)),
    })),
    ...sites.map((site) => ({ path: SITES[site].clockTable, content: clockTableText(site) })),
    ...feedFiles(PULSARS.flatMap((pulsar) => observe(pulsar, truthOf(pulsar), tables, clocks))),
    { path: 'expected.json', content: `${JSON.stringify(expectedAnswers(), null, 2)}\n` },
  ];
}

/** `KR 0137+58` → `KR0137+58.toml` */
function fileName(pulsar: string): string {
  return `${pulsar.replace(' ', '')}.toml`;
}

function writeAll(folder: string): void {
  for (const made of ['models', 'clock', ...FEEDS]) rmSync(join(folder, made), { recursive: true, force: true });
  for (const { path, content } of madeFiles()) {
    mkdirSync(dirname(join(folder, path)), { recursive: true });
    writeFileSync(join(folder, path), content);
  }
}

if (process.argv[1] === fileURLToPath(import.meta.url)) writeAll(dirname(fileURLToPath(import.meta.url)));

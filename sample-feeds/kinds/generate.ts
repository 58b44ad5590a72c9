import { mkdirSync, rmSync, writeFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { loadTables } from '../../daemon/tables/loadTables.ts';
import type { MadeFile } from '../making/feedFiles.ts';
import { SITES, type SiteName } from '../making/observatory.ts';
import { mjdText, observe, type RecordedArrival } from '../making/observing.ts';
import type { InventedOrbit } from '../making/pulsars.ts';
import { clockTable, clockTableText } from '../making/siteClock.ts';
import { startModel } from '../making/startModel.ts';
import { truthOf } from '../making/truth.ts';
import { expectedOfKinds } from './expected.ts';
import { GLITCHES_OF_KINDS, PULSARS_OF_KINDS, type PulsarOfKind } from './pulsars.ts';

// Makes the feeds of the five kinds anew: `npx tsx sample-feeds/kinds/generate.ts`. What is planted stands in pulsars.ts.

const SITE: SiteName = 'kestrel ridge';

/** Every file but the configuration and the page that explains it, which are written by hand. */
export function filesOfKinds(): MadeFile[] {
  const { tables } = loadTables({ hostLeapSecondFiles: [] });
  const clocks = new Map([[SITE, clockTable(SITE)]]);
  const made = PULSARS_OF_KINDS.flatMap((pulsar) => {
    const truth = truthOf(pulsar, GLITCHES_OF_KINDS);
    const model = startModel(pulsar, truth) + (pulsar.orbit === undefined ? '' : orbitTable(pulsar.orbit));
    return [
      { path: `models/${fileName(pulsar)}.toml`, content: model },
      { path: `${feedOf(pulsar)}/${fileName(pulsar)}.csv`, content: table(observe(pulsar, truth, tables, clocks)) },
    ];
  });
  return [
    ...made,
    { path: SITES[SITE].clockTable, content: clockTableText(SITE) },
    { path: 'expected.json', content: `${JSON.stringify(expectedOfKinds(), null, 2)}\n` },
  ];
}

/** `KR 0312+46` → `KR0312+46` */
function fileName({ name }: PulsarOfKind): string {
  return name.replace(' ', '');
}

function feedOf({ programme }: PulsarOfKind): 'radio' | 'x-ray' {
  return programme.every(({ receiver }) => receiver.site === 'barycentre') ? 'x-ray' : 'radio';
}

function table(recorded: readonly RecordedArrival[]): string {
  const time = recorded[0]!.receiver.site === 'barycentre' ? 'mjd_tdb' : 'mjd_utc';
  const rows = recorded.map(({ pulsar, reading, uncertaintyUs, receiver }) => {
    const { frequencyMhz, site, name } = receiver;
    const frequency = Number.isFinite(frequencyMhz) ? frequencyMhz.toFixed(3) : 'inf';
    return `${pulsar},${mjdText(reading)},${uncertaintyUs.toFixed(2)},${frequency},${site},${name}`;
  });
  return `${[`pulsar,${time},uncertainty_us,frequency_mhz,site,receiver`, ...rows].join('\n')}\n`;
}

function orbitTable(orbit: InventedOrbit): string {
  return `
[orbit]
form = "keplerian"
period_days = "${orbit.periodDays}"
projected_semi_major_axis_s = "${orbit.semiMajorAxisLightS}"
eccentricity = "${orbit.eccentricity}"
periastron_longitude_deg = "${orbit.periastronLongitudeDeg}"
periastron_epoch_mjd = "${orbit.periastronMjd}"
`;
}

const FOLDER = dirname(fileURLToPath(import.meta.url));

function writeAll(): void {
  for (const made of ['models', 'clock', 'radio', 'x-ray'])
    rmSync(join(FOLDER, made), { recursive: true, force: true });
  for (const { path, content } of filesOfKinds()) {
    mkdirSync(dirname(join(FOLDER, path)), { recursive: true });
    writeFileSync(join(FOLDER, path), content);
  }
}

if (process.argv[1] === fileURLToPath(import.meta.url)) writeAll();

import { type ClockTable, parseClockTable } from '../../detectors/time/siteClock.ts';
import type { ConfigProblem, Site } from './configuration.ts';
import type { Surroundings } from './mailSettings.ts';
import type { SectionReader } from './sectionReader.ts';
import { siteTable } from './sections.ts';
import { readTextFile } from './textFile.ts';
import type { TomlPath } from './tomlDocument.ts';

/** The Earth's surface lies between these distances from its centre (WGS 84: polar radius 6356.8 km, equatorial 6378.1 km). */
const SURFACE_M = [6_345_000, 6_395_000] as const;

export function readSites(reader: SectionReader, around: Surroundings, problems: ConfigProblem[]): (Site | null)[] {
  const seen = new Set<string>();
  return reader.tablesOf(['site']).map((path) => {
    const table = reader.read(path, siteTable);
    if (table === null) return null;
    const at = [...path, 'name'];
    if (table.name === 'barycentre')
      reader.error(at, '"barycentre" is what arrivals already at the barycentre say; it has no place on Earth');
    if (seen.has(table.name)) reader.error(at, `there is a site "${table.name}" already`);
    seen.add(table.name);
    checkPlace(reader, [...path, 'itrf_m'], table.name, Math.hypot(...table.itrf_m));
    const clockTable =
      table.clock_table === undefined
        ? null
        : loadClockTable(reader, [...path, 'clock_table'], around.absolute(table.clock_table), problems);
    return { name: table.name, itrfM: table.itrf_m, clockTable };
  });
}

function checkPlace(reader: SectionReader, path: TomlPath, name: string, distanceM: number): void {
  if (name === 'geocentre') {
    if (distanceM !== 0) reader.error(path, 'the site "geocentre" is at [0, 0, 0]');
  } else if (distanceM < SURFACE_M[0] || distanceM > SURFACE_M[1]) {
    const found = `${(distanceM / 1000).toPrecision(6)} km from the Earth's centre`;
    reader.error(path, `is ${found}; a telescope is 6345 to 6395 km from it. ITRF coordinates in metres are wanted`);
  }
}

function loadClockTable(
  reader: SectionReader,
  path: TomlPath,
  file: string,
  problems: ConfigProblem[],
): ClockTable | null {
  const read = readTextFile(file);
  if ('problem' in read) {
    reader.error(path, `${file} ${read.problem}`);
    return null;
  }
  const parsed = parseClockTable(read.text, file);
  const [rows, severity] =
    'table' in parsed ? [parsed.warnings, 'warning' as const] : [parsed.problems, 'error' as const];
  for (const { line, message } of rows) problems.push({ file, line, column: null, message, severity });
  return 'table' in parsed ? parsed.table : null;
}

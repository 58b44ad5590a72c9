import { readColumnsTable } from './columnsTable.ts';
import type { Feed } from './configuration.ts';
import { checkFeedFolder } from './folders.ts';
import type { Surroundings } from './mailSettings.ts';
import type { SectionReader } from './sectionReader.ts';
import { feedTable } from './sections.ts';

const DEFAULT_POLL_SECONDS = 30;

/** @param sites names of the sites that are described */
export function readFeeds(reader: SectionReader, around: Surroundings, sites: readonly string[]): (Feed | null)[] {
  const seen = new Set<string>();
  const paths = reader.tablesOf(['feed']);
  if (paths.length === 0) reader.error(['feed'], 'there is no [[feed]]: name at least one folder to watch');
  return paths.map((path) => {
    const table = reader.read(path, feedTable);
    if (table === null) return null;
    if (seen.has(table.name)) reader.error([...path, 'name'], `there is a feed "${table.name}" already`);
    seen.add(table.name);
    const folder = around.absolute(table.folder);
    checkFeedFolder(reader, { title: `feed "${table.name}"`, path: [...path, 'folder'], folder });
    const { layout } = table;
    const columns = layout === 'columns' ? readColumnsTable(reader, [...path, 'columns'], sites) : null;
    if (layout === 'columns' && columns === null) return null;
    if (layout !== 'columns' && table.columns !== undefined) {
      reader.error([...path, 'columns'], `belongs to layout = "columns"; this feed's layout is "${layout}"`);
    }
    return {
      name: table.name,
      folder,
      layout,
      columns,
      recursive: table.recursive,
      pollSeconds: table.poll_seconds ?? DEFAULT_POLL_SECONDS,
      polling: table.poll_seconds !== undefined,
      expectEveryHours: table.expect_every_hours ?? null,
    };
  });
}

import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { loadConfiguration } from '../../daemon/config/loadConfiguration.ts';
import type { TextColumns } from '../../daemon/intake/layouts/textColumns.ts';
import { CONFIGURATION, writeConfiguration } from './configurationFolder.ts';

/** A site more than the configuration of the tests has. */
const COAST = '[[site]]\nname = "coast"\nitrf_m = [-2390490.0, 5564764.0, 1994727.0]\n';

/** What the configuration makes of `[feed.columns]` and what stands under it; complaints without their place. */
export function configuredColumns(table: string): {
  readonly columns: TextColumns | null;
  readonly complaints: readonly string[];
} {
  const folder = mkdtempSync(join(tmpdir(), 'spinvigil-'));
  try {
    const configuration = CONFIGURATION.replace(
      'layout = "csv"',
      `layout = "columns"\n[feed.columns]\n${table}`,
    ).replace('[[feed]]', `${COAST}[[feed]]`);
    const loaded = loadConfiguration(writeConfiguration(folder, { configuration }));
    const complaints = loaded.problems.map(({ message }) => message);
    return { columns: loaded.configuration?.feeds[0]?.columns ?? null, complaints };
  } finally {
    rmSync(folder, { recursive: true });
  }
}

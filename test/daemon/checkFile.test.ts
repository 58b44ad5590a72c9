import { writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { check } from '../../daemon/commands/check.ts';
import { CONFIGURATION, writeConfiguration } from '../support/configurationFolder.ts';
import { keptTerminal } from '../support/keptTerminal.ts';
import { useTemporaryFolders } from '../support/temporaryFolder.ts';

const newFolder = useTemporaryFolders();
const TEXT = `# night
KR0417 60975.8912345678901234 38.2 1400
KR0417 60975.9 x 1400
KR9999 60975.9 1 1400
`;
const COLUMNS = `layout = "columns"
[feed.columns]
separator = "blanks"
time = { column = 2, format = "mjd" }
uncertainty = { column = 3, unit = "us" }
frequency = { column = 4, unit = "MHz" }
pulsar = { column = 1, names = { KR0417 = "KR 0417+31", KR9999 = "KR 9999+99" } }
site = { fixed = "ridge" }`;

async function checked(options: { readonly feed?: string; readonly json?: boolean }, text = TEXT) {
  const folder = newFolder();
  const config = writeConfiguration(folder, { configuration: CONFIGURATION.replace('layout = "csv"', COLUMNS) });
  const file = join(folder, options.feed === undefined ? 'arrivals' : '.', 'night.txt');
  writeFileSync(file, text);
  const terminal = keptTerminal();
  const failure = await check(terminal, { config, file, ...options }).catch((error: Error) => error.message);
  return { out: terminal.stdout(), failure };
}

describe('check --file', () => {
  it('shows the first rows quantity by quantity, and every complaint with line and column', async () => {
    const { out, failure } = await checked({});
    expect(out).toMatch(/as feed nightly reads it \(layout columns\)/);
    expect(out).toMatch(/^pulsar +KR 0417\+31 +KR 9999\+99$/m);
    expect(out).toMatch(/^time +60975\.8912345678901234 UTC \(MJD\)/m);
    expect(out).toMatch(/^uncertainty +38\.2 µs/m);
    expect(out).toContain('line 3: uncertainty_us (column 3) "x" is not a decimal number\n');
    expect(out).toMatch(/line 4: pulsar "KR 9999\+99" has no model/);
    expect(out).toContain('1 rows can be used, 2 cannot.');
    expect(failure).toMatch(/2 rows of .*night\.txt cannot be used/);
  });

  it('takes the feed that is named for a file that lies elsewhere, and speaks JSON', async () => {
    const { out, failure } = await checked({ feed: 'nightly', json: true }, TEXT.split('\n').slice(0, 2).join('\n'));
    expect(failure).toBeUndefined();
    expect(JSON.parse(out)).toMatchObject({
      feed: 'nightly',
      layout: 'columns',
      usable: 1,
      complaints: [],
      unterminated: true,
      rows: [{ line: 2, timeText: '60975.8912345678901234' }],
    });
    expect((await checked({ feed: 'nigthly' })).failure).toMatch(/there is no feed “nigthly”/);
  });

  it('says why a file cannot be read at all', async () => {
    expect((await checked({}, '')).failure).toMatch(/night\.txt is empty/);
  });
});

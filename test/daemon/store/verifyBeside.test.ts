import Database from 'better-sqlite3';
import { afterEach, beforeEach, expect, test } from 'vitest';
import { storageTrouble } from '../../../daemon/store/index.ts';
import { recordFile } from '../../../daemon/store/stateFolder.ts';
import { verifyBeside } from '../../../daemon/store/verifyBeside.ts';
import { AT, fileBatch, NEXT_DAY, notice, open, temporaryFolder } from './sample.ts';

let folder: ReturnType<typeof temporaryFolder>;
beforeEach(() => {
  folder = temporaryFolder();
});
afterEach(() => folder.remove());
const PATIENCE_MS = 60_000;

test('the record is checked in another process, while this one reads and writes', {
  timeout: PATIENCE_MS,
}, async () => {
  const store = open(folder.path);
  store.commitIntake(fileBatch(0, 3));
  let isDone = false;
  const checked = store.verifyBeside().finally(() => {
    isDone = true;
  });
  let written = 0;
  for (; !isDone; written++) {
    store.commitNotice(notice(written), AT);
    await new Promise((resolve) => setImmediate(resolve));
  }
  expect(await checked).toEqual([]);
  expect(written).toBeGreaterThan(3);
  expect(store.outbox()).toHaveLength(written);

  const other = new Database(recordFile(folder.path));
  other.pragma('ignore_check_constraints = ON');
  other.exec('UPDATE files SET stored = stored + 1, row_count = row_count + 1');
  other.close();
  expect(await store.verifyBeside()).toEqual(store.verify());
  expect(store.verify()).toHaveLength(1);
  store.close();
});

test('trouble of the storage keeps its kind on the way', { timeout: PATIENCE_MS }, async () => {
  const trouble = await verifyBeside(`${folder.path}/${NEXT_DAY}`).catch((error) => error);
  expect(storageTrouble(trouble)).toBe('fault');
});

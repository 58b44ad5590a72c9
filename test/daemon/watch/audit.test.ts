import { expect, test } from 'vitest';
import { createAudit } from '../../../daemon/watch/audit.ts';
import type { FoundFile } from '../../../daemon/watch/scan.ts';

const DAY_MS = 86_400_000;
const filesNamed = (count: number) =>
  Array.from({ length: count }, (_, i) => ({ path: `${i}.csv`, pathBytes: Buffer.from(`${i}.csv`) }) as FoundFile);

test.each([
  [1, 30_000],
  [7, 3_600_000],
  [1000, 30_000],
  [50_000, 30_000],
])('A4: each of %i files comes up once a day, with a look every %i ms', (count, everyMs) => {
  const files = filesNamed(count);
  const audit = createAudit(0);
  const seen = new Map<string, number>();
  let most = 0;
  for (let ms = everyMs; ms <= DAY_MS; ms += everyMs) {
    const due = audit.due(files, ms);
    most = Math.max(most, due.length);
    for (const { path } of due) seen.set(path, (seen.get(path) ?? 0) + 1);
  }
  // The last may come a look later.
  expect(seen.size).toBeGreaterThanOrEqual(count - 1);
  expect(Math.max(...seen.values(), 1)).toBe(1);
  expect(most).toBeLessThanOrEqual(Math.ceil((count * everyMs) / DAY_MS) + 1);
});

test('a look after a long pause does not hold up the next', () => {
  expect(createAudit(0).due(filesNamed(50_000), 3 * DAY_MS)).toHaveLength(100);
});

test('nothing is due in an empty folder', () => {
  expect(createAudit(0).due([], 3 * DAY_MS)).toEqual([]);
});

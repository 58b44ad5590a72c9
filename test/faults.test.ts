import { existsSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import { expect, test } from 'vitest';
import { ROOT } from './support/sourceTree.ts';

// The table of faults against the tests themselves: nothing forgotten, nothing invented.

/** How many faults of each group there are. */
const CATALOGUE = { A: 44, B: 18, C: 17, D: 19, E: 17, 'F-': 11 } as const;
const IDS = Object.entries(CATALOGUE).flatMap(([group, count]) =>
  Array.from({ length: count }, (_, i) => `${group}${i + 1}`),
);

interface Row {
  readonly id: string;
  readonly coveredBy: string;
  readonly result: string;
}

const rows = readFileSync(join(ROOT, 'test', 'faults.md'), 'utf8')
  .split('\n')
  .filter((line) => /^\| (?:[A-E]\d|F-\d)/.test(line))
  .map((line): Row => {
    const cells = line.replaceAll('\\|', '\u0000').split('|');
    const cell = (n: number) => (cells[n] ?? '').replaceAll('\u0000', '|').trim();
    return { id: cell(1), coveredBy: cell(3), result: cell(4) };
  });

const testsOf = ({ coveredBy }: Row) =>
  [...coveredBy.matchAll(/`([^`]+\.test\.ts)`: “([^”]*)”/g)].map(([, file = '', name = '']) => ({ file, name }));
const studiesOf = ({ coveredBy }: Row) => [...coveredBy.matchAll(/study `([^`]+)`/g)].map(([, file = '']) => file);

test('every fault stands in the table once', () => {
  expect(rows.map(({ id }) => id)).toEqual(IDS);
});

test('every test of the table is there under that name, and bears the id', () => {
  const wrong = rows.flatMap((row) =>
    testsOf(row).flatMap(({ file, name }) => {
      if (!existsSync(join(ROOT, file))) return [`${row.id}: there is no ${file}`];
      const source = readFileSync(join(ROOT, file), 'utf8').replaceAll("\\'", "'");
      if (!source.includes(`'${name}'`)) return [`${row.id}: ${file} has no “${name}”`];
      return new RegExp(`\\b${row.id}\\b`).test(name) ? [] : [`${row.id}: “${name}” does not bear the id`];
    }),
  );
  expect(wrong).toEqual([]);
});

test('every study of the table is there with its result', () => {
  const missing = rows
    .flatMap(studiesOf)
    .flatMap((file) => [file, file.replace(/\.ts$/, '.json')])
    .filter((file) => !existsSync(join(ROOT, file)));
  expect(missing).toEqual([]);
});

test('a fault that nothing covers, or only in part, says why', () => {
  for (const row of rows) {
    const isCovered = testsOf(row).length + studiesOf(row).length > 0;
    expect(isCovered ? ['passes', 'in part'] : ['not covered'], row.id).toContain(row.result);
    if (!isCovered) expect(row.coveredBy, row.id).toMatch(/^not covered: .{20}/);
  }
});

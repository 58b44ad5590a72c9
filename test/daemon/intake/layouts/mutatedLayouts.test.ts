import { expect, test } from 'vitest';
import { readMutatedFiles } from '../../../support/mutatedLayouts.ts';

// Six thousand files; a million: npx tsx test/studies/mutatedLayouts.ts
test('files of every layout, damaged at random, crash no reader and give no row that a slow reader does not read', () => {
  const count = readMutatedFiles(4711, 6000);
  // Worth something only while good rows, bad rows and whole refusals all come up often.
  expect(count.rows).toBeGreaterThan(2000);
  expect(count.rejects).toBeGreaterThan(300);
  expect(count.faults).toBeGreaterThan(1000);
});

import { existsSync, mkdirSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { expect } from 'vitest';

const FOLDER = join(dirname(fileURLToPath(import.meta.url)), 'golden');

/**
 * GOLDEN: compares with a file of our own earlier output, reviewed by eye. It shows that something changed, not that it is right. What
 * differs is written beside it as `*.changed`; look at it, and rename it if it is better. A missing file is a failure, never a pass.
 */
export function expectGolden(name: string, text: string): void {
  const path = join(FOLDER, name);
  const changed = `${path}.changed`;
  if (existsSync(path) && readFileSync(path, 'utf8') === text) {
    rmSync(changed, { force: true });
    return;
  }
  mkdirSync(FOLDER, { recursive: true });
  writeFileSync(changed, text);
  expect.fail(`${name} differs from what was reviewed: compare it with golden/${name}.changed`);
}

import { spawnSync } from 'node:child_process';
import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, test } from 'vitest';
import { ROOT } from '../support/sourceTree.ts';

const UNIT = join(ROOT, 'daemon', 'spinvigil.service');
const unit = readFileSync(UNIT, 'utf8');
const hasSystemd = spawnSync('systemd-analyze', ['--version']).status === 0;
if (!hasSystemd)
  console.warn('SKIPPED: systemd-analyze is not installed, so that the exposure of the service unit is not measured');

describe('the systemd unit', () => {
  test('F-10: leaves the JavaScript engine able to run', () => {
    // V8 writes the code it runs: https://github.com/nodejs/node/issues/55509.
    expect(unit).not.toMatch(/^MemoryDenyWriteExecute=/m);
  });

  test('does not start again what cannot start', () => {
    expect(unit).toMatch(/^RestartPreventExitStatus=2 3$/m);
  });

  test.skipIf(!hasSystemd)('F-10: has an exposure of 2.0 at most, as systemd rates it', () => {
    // The threshold is in tenths.
    const rated = spawnSync('systemd-analyze', ['security', '--offline=yes', '--threshold=20', UNIT], {
      encoding: 'utf8',
    });
    expect(rated.status, rated.stdout + rated.stderr).toBe(0);
  });
});

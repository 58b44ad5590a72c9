import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, test } from 'vitest';
import { ROOT } from './support/sourceTree.ts';

// What `npm ci` installs is what was looked at: `npm ci` itself refuses a lock file that does not fit package.json.

interface Package {
  readonly version?: string;
  readonly integrity?: string;
  readonly link?: boolean;
  readonly hasInstallScript?: boolean;
}

const read = (file: string) => JSON.parse(readFileSync(join(ROOT, file), 'utf8'));
const { packages, lockfileVersion } = read('package-lock.json') as {
  packages: Record<string, Package>;
  lockfileVersion: number;
};
const own = read('package.json') as Record<string, Record<string, string | boolean>>;
const installed = Object.entries(packages).filter(([place]) => place !== '');

describe('F-9: the packages', () => {
  test('stand in the lock file with version and checksum, each', () => {
    expect(lockfileVersion).toBe(3);
    expect(installed.length).toBeGreaterThan(100);
    const loose = installed.filter(
      ([, { version, integrity, link }]) => version === undefined || link === true || !/^sha512-/.test(integrity ?? ''),
    );
    expect(loose.map(([place]) => place)).toEqual([]);
  });

  test('that we ask for are asked for by one version, and that is the one in the lock file', () => {
    for (const group of ['dependencies', 'devDependencies']) {
      for (const [name, version] of Object.entries(own[group] ?? {})) {
        expect(packages[`node_modules/${name}`]?.version, name).toBe(version);
      }
    }
  });

  test('that run a script when they are installed are the two that may', () => {
    const scripted = installed.filter(([, { hasInstallScript }]) => hasInstallScript === true).map(([place]) => place);
    expect(scripted).toEqual(['node_modules/better-sqlite3', 'node_modules/esbuild']);
    expect(Object.keys(own['allowScripts'] ?? {}).map((name) => `node_modules/${name}`)).toEqual(scripted);
  });
});

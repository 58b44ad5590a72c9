import { createHash } from 'node:crypto';
import { copyFileSync, existsSync, mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, describe, expect, it } from 'vitest';
import { packageRoot } from '../../../daemon/packageRoot.ts';
import { leapSecondWarning, loadTables } from '../../../daemon/tables/loadTables.ts';
import { earthAndSunAt } from '../../../detectors/sky/earthSunTable.ts';

const shipped = join(packageRoot(), 'daemon', 'tables');
const scratch = mkdtempSync(join(tmpdir(), 'spinvigil-tables-'));
afterAll(() => rmSync(scratch, { recursive: true }));

const listText = readFileSync(join(shipped, 'leap-seconds.list'), 'utf8');
const shippedExpiry = loadTables({ hostLeapSecondFiles: [] }).tables.leapSeconds.expiresMjd;

/** The same list with another expiry date, its SHA-1 line made anew by the list's own rule. */
function listThatExpires(mjd: number): string {
  const text = listText.replace(/^#@.*$/m, `#@\t${(mjd - 15_020) * 86_400}`);
  const stamps = [...text.matchAll(/^#[$@]\s*(\d+)/gm)].map((match) => match[1]);
  const rows = [...text.matchAll(/^(\d+)\s+(\d+)/gm)].flatMap((match) => [match[1], match[2]]);
  const digest = createHash('sha1')
    .update([...stamps, ...rows].join(''))
    .digest('hex');
  return text.replace(/^#h.*$/m, `#h ${digest.match(/.{8}/g)!.join(' ')}`);
}

function hostFile(name: string, text: string): string {
  const file = join(scratch, name);
  writeFileSync(file, text);
  return file;
}

describe('leap-second list', () => {
  it('the shipped one is sound and reaches into 2027', () => {
    expect(shippedExpiry).toBeGreaterThanOrEqual(61_584);
  });

  it('a newer one of the host is preferred, an older one is not', () => {
    const newer = hostFile('newer', listThatExpires(shippedExpiry + 180));
    const older = hostFile('older', listThatExpires(shippedExpiry - 365));
    const load = (files: string[]) => loadTables({ hostLeapSecondFiles: files });
    expect(load([older, newer]).tables.leapSeconds.expiresMjd).toBe(shippedExpiry + 180);
    expect(load([older]).tables.leapSeconds.expiresMjd).toBe(shippedExpiry);
    expect(load([older, newer]).warnings).toEqual([]);
  });

  it.each([
    ['wrong-digest', listThatExpires(70_000).replace(/^#h ./m, '#h x'), /SHA-1/],
    [
      'changed-row',
      listThatExpires(70_000).replace(/^3692217600(\s+)37/m, '3692217599$137'),
      /line \d+: not the start/,
    ],
    ['one-digit', listThatExpires(70_000).replace(/^#\$\s+\d/m, '#$ 9'), /SHA-1/],
    ['cut', listThatExpires(70_000).slice(0, 3000), /expir|no leap|SHA-1/],
    ['empty', '', /no leap seconds/],
  ])('a damaged one (%s) is a warning and is not used', (name, text, problem) => {
    const { tables, warnings } = loadTables({ hostLeapSecondFiles: [hostFile(name, text)] });
    expect(warnings).toEqual([expect.stringMatching(problem)]);
    expect(warnings[0]).toContain(join(scratch, name));
    expect(tables.leapSeconds.expiresMjd).toBe(shippedExpiry);
  });

  it('a host without one is nothing to speak of', () => {
    expect(loadTables({ hostLeapSecondFiles: [join(scratch, 'none')] }).warnings).toEqual([]);
  });

  it('is warned of a month ahead and after its end', () => {
    const table = { entries: [], expiresMjd: 61_000 };
    expect(leapSecondWarning(table, 60_969)).toBeNull();
    expect(leapSecondWarning(table, 60_970)).toMatch(/expires in 30 days/);
    expect(leapSecondWarning(table, 61_010)).toMatch(/expired 10 days ago/);
  });
});

describe('sky tables', () => {
  it('are refused when one bit is wrong or the file is cut', () => {
    copyFileSync(join(shipped, 'leap-seconds.list'), join(scratch, 'leap-seconds.list'));
    const bytes = readFileSync(join(shipped, 'earth-sun.bin'));
    const load = (content: Uint8Array) => {
      writeFileSync(join(scratch, 'earth-sun.bin'), content);
      return () => loadTables({ folder: scratch, hostLeapSecondFiles: [] });
    };
    expect(load(bytes)).not.toThrow();
    bytes[bytes.length >> 1]! ^= 1;
    expect(load(bytes)).toThrow(/earth-sun\.bin: the checksum is wrong; install the package anew/);
    bytes[bytes.length >> 1]! ^= 1;
    expect(load(bytes.subarray(0, 1000))).toThrow(/checksum/);
    expect(load(new Uint8Array(0))).toThrow(/checksum/);
  });

  it('name the missing file', () => {
    expect(() => loadTables({ folder: join(scratch, 'nowhere') })).toThrow(/earth-sun\.bin/);
  });
});

/** The file of Debian's package casacore-data-jpl-de405, from which the tables were made. */
const SOURCE = '/usr/share/casacore/data/ephemerides/DE405/table.f0i';
const LIGHT_KM_PER_NS = 299_792.458e-9;
const sourceIsThere = existsSync(SOURCE);
if (!sourceIsThere) {
  console.warn('SKIPPED: Earth and Sun against the JPL DE405 data; install the Debian package casacore-data-jpl-de405');
}

describe.skipIf(!sourceIsThere)('against the JPL DE405 data', () => {
  it('on 2000 dates: the Earth within 0.2 ns of light time, the Sun (for its Shapiro delay only) within 1 ns', () => {
    const file = readFileSync(SOURCE);
    const { earthSun } = loadTables({ hostLeapSecondFiles: [] }).tables;
    const span = earthSun.endMjd - earthSun.startMjd;
    let worstEarth = 0;
    let worstSun = 0;
    for (let i = 0; i < 2000; i++) {
      const day = earthSun.startMjd + Math.floor(((i * 0.618_033_988_75) % 1) * span);
      const fraction = (i % 1024) / 1024; // day + fraction is then exact
      const ours = earthAndSunAt(earthSun, { day, fraction })!;
      for (let k = 0; k < 3; k++) {
        const moon = source(file, 438, 13, 8, k, day + fraction);
        const earth = source(file, 228, 13, 2, k, day + fraction) - moon / (1 + 81.30056);
        const sun = source(file, 750, 11, 2, k, day + fraction);
        worstEarth = Math.max(worstEarth, Math.abs(ours.earthKm[k]! - earth) / LIGHT_KM_PER_NS);
        worstSun = Math.max(worstSun, Math.abs(ours.sunKm[k]! - sun) / LIGHT_KM_PER_NS);
      }
    }
    console.info(`against DE405: Earth ${worstEarth.toFixed(3)} ns, Sun ${worstSun.toFixed(3)} ns at most`);
    expect(worstEarth).toBeLessThan(0.2);
    expect(worstSun).toBeLessThan(1);
  });
});

/** One component of one body, km, by the plain sum of c cos(n arccos x): records of 32 days from MJD 36912. */
function source(file: Buffer, first: number, terms: number, parts: number, component: number, mjd: number): number {
  const record = Math.floor((mjd - 36_912) / 32);
  const since = mjd - 36_912 - 32 * record;
  const part = Math.floor((since * parts) / 32);
  const angle = Math.acos((2 * (since * parts)) / 32 - 2 * part - 1);
  let total = 0;
  for (let n = 0; n < terms; n++) {
    const at = first + (part * 3 + component) * terms + n;
    total += file.readDoubleLE(28 + 8160 * record + 8 * at) * Math.cos(n * angle);
  }
  return total;
}

import { execFileSync } from 'node:child_process';
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, describe, expect, it } from 'vitest';
import { loadTables } from '../../../daemon/tables/loadTables.ts';
import { barycentre } from '../../../detectors/sky/barycentre.ts';
import { earthAndSunAt } from '../../../detectors/sky/earthSunTable.ts';
import { readSpkKernel } from '../../../detectors/sky/spkFile.ts';
import { earthAndSunFromKernel, type SpkKernel } from '../../../detectors/sky/spkKernel.ts';
import { addSeconds, daysBetween, type Mjd } from '../../../detectors/time/mjd.ts';
import { builtInArrays } from '../../support/builtInKernel.ts';
import { arrivalAt, pulsarAt } from '../../support/sky.ts';
import { inMemory, type SpkArray, spkFile } from '../../support/spkFile.ts';

const ALL = { name: 'k.bsp', fromMjd: 40_000, toMjd: 75_000 };
const DAY_S = 86_400;
const LIGHT_KM_PER_NS = 299_792.458e-9;
const BOTH_ORDERS = [{ littleEndian: true }, { littleEndian: false }];

function read(bytes: Uint8Array, options = ALL): SpkKernel {
  const result = readSpkKernel(inMemory(bytes), options);
  if ('problem' in result) throw new Error(result.problem);
  return result.kernel;
}

function problemOf(bytes: Uint8Array, options = ALL): string {
  const result = readSpkKernel(inMemory(bytes), options);
  return 'problem' in result ? result.problem : '';
}

function motion(kernel: SpkKernel, at: Mjd) {
  const found = earthAndSunFromKernel(kernel, at);
  if ('reason' in found) throw new Error(found.reason);
  return found;
}

/** Straight lines: 3 and 399 of type 2 over days 0 to 20 from J2000, the Sun of type 3 in two arrays that overlap. */
const LINES: SpkArray[] = [
  line({ target: 3, centre: 0, type: 2, records: repeat(5, [1000, 10, 2000, 20, 3000, 30]) }),
  line({ target: 10, centre: 0, type: 3, records: repeat(5, sixOf([7, 0, 8, 0, 9, 0])) }),
  line({ target: 399, centre: 3, type: 2, records: repeat(5, [1, 0.5, 2, 0, 3, 0]) }),
  line({ target: 10, centre: 0, type: 3, firstS: 10 * DAY_S, records: repeat(2, sixOf([70, 0, 80, 0, 90, 0])) }),
  line({ target: 499, centre: 4, type: 2, records: repeat(5, [1, 1, 1]) }),
];

function line(array: Omit<SpkArray, 'firstS' | 'intervalS'> & { readonly firstS?: number }): SpkArray {
  return { firstS: 0, intervalS: 4 * DAY_S, ...array };
}

function repeat(count: number, record: number[]): number[][] {
  return Array.from({ length: count }, () => record);
}

/** Positions, then rates that are told apart from the positions' own. */
function sixOf(positions: number[]): number[] {
  return [...positions, 1, 0, 2, 0, 3, 0];
}

describe('an SPK kernel', () => {
  it.each(BOTH_ORDERS)('gives back what was written, by hand: %o', (order) => {
    const kernel = read(spkFile(LINES, order));
    // Day 5.5 is in the second interval, at x = −0.25.
    const { earthKm, earthKmPerS, sunKm } = motion(kernel, { day: 51_550, fraction: 0 });
    expect(earthKm).toEqual([1000 - 2.5 + 1 - 0.125, 2000 - 5 + 2, 3000 - 7.5 + 3]);
    expect(earthKmPerS[0]).toBeCloseTo(10.5 / (2 * DAY_S), 15);
    expect(sunKm).toEqual([7, 8, 9]);
  });

  it('takes the later of two arrays that cover a date, and the earlier where it ends', () => {
    const kernel = read(spkFile(LINES));
    expect(motion(kernel, { day: 51_555, fraction: 0 }).sunKm).toEqual([70, 80, 90]);
    expect(motion(kernel, { day: 51_563, fraction: 0 }).sunKm).toEqual([7, 8, 9]);
  });

  it('says at which dates it has no answer', () => {
    const kernel = read(spkFile(LINES));
    for (const day of [51_544, 51_565, Number.NaN, Number.POSITIVE_INFINITY]) {
      expect(earthAndSunFromKernel(kernel, { day, fraction: 0 })).toHaveProperty('reason');
    }
    expect(earthAndSunFromKernel(kernel, { day: 51_565, fraction: 0 })).toEqual({
      reason:
        'MJD 51565 is outside what the kernel k.bsp holds for the Earth (body 3 from MJD 51544.5 to 51564.5, body 399 from MJD 51544.5 to 51564.5)',
    });
  });

  it('keeps only what touches the dates wanted', () => {
    const kernel = read(spkFile(LINES), { ...ALL, fromMjd: 51_550, toMjd: 51_551 });
    expect(kernel.segments.map(({ target, intervals }) => [target, intervals])).toEqual([
      [3, 1],
      [10, 1],
      [399, 1],
    ]);
    expect(motion(kernel, { day: 51_550, fraction: 0 }).earthKm[0]).toBe(1000 - 2.5 + 1 - 0.125);
    expect(earthAndSunFromKernel(kernel, { day: 51_552, fraction: 0 })).toHaveProperty('reason');
  });

  it.each(BOTH_ORDERS)('made of the built-in table says the same to 1 ps of light time: %o', (order) => {
    const table = loadTables({ hostLeapSecondFiles: [] }).tables.earthSun;
    const kernel = read(spkFile(builtInArrays(58_000, 58_400), order));
    let worst = 0;
    for (let i = 0; i < 300; i++) {
      const at = { day: 58_000 + i, fraction: (i * 0.618_033_988_75) % 1 };
      const ours = earthAndSunAt(table, at)!;
      const theirs = motion(kernel, at);
      for (let k = 0; k < 3; k++) {
        worst = Math.max(
          worst,
          Math.abs(ours.earthKm[k]! - theirs.earthKm[k]!),
          Math.abs(ours.sunKm[k]! - theirs.sunKm[k]!),
        );
        expect(theirs.earthKmPerS[k]).toBeCloseTo(ours.earthKmPerS[k]!, 11);
      }
    }
    expect(worst / LIGHT_KM_PER_NS).toBeLessThan(1e-3);
  });

  it('moves the arrival by what it moves the Earth, and marks what it does not cover', () => {
    const { tables } = loadTables({ hostLeapSecondFiles: [] });
    const site = { itrfM: [3_822_626.04, -154_105.65, 5_086_486.04], clock: null } as const;
    const towardsX = pulsarAt({
      rightAscensionRad: 0,
      declinationRad: 0,
      parallaxMas: 0,
      properMotionMasPerYr: [0, 0],
    });
    const tdb = (earthSun: SpkKernel | null, text: string) =>
      barycentre(arrivalAt(text, 1400), towardsX, site, earthSun === null ? tables : { ...tables, earthSun });
    const same = read(spkFile(builtInArrays(58_000, 58_400)));
    const shifted = read(spkFile(builtInArrays(58_000, 58_400, { shiftKm: 300 })));
    const built = tdb(null, '58123.25').tdb;
    expect(Math.abs(daysBetween(tdb(same, '58123.25').tdb, built)) * DAY_S).toBeLessThan(2e-11);
    expect(daysBetween(tdb(shifted, '58123.25').tdb, built) * DAY_S).toBeCloseTo(300 / 299_792.458, 8);
    expect(tdb(same, '59123.25')).toMatchObject({
      quality: 'unusable',
      qualityReasons: [expect.stringMatching(/^MJD 59123 is outside what the kernel k\.bsp holds for the Earth/)],
    });
  });
});

describe('a file that is no usable kernel', () => {
  const good = spkFile(LINES);
  const patched = (at: number, text: string) => {
    const bytes = good.slice();
    bytes.set(Buffer.from(text, 'latin1'), at);
    return bytes;
  };
  it.each([
    ['empty', new Uint8Array(0), /shorter than the head/],
    ['other', new Uint8Array(5000).fill(65), /is not an SPK kernel/],
    ['other format', patched(88, 'VAX-GFLT'), /not IEEE 754 \("VAX-GFLT"\)/],
    ['sent as text', patched(706, '\n'), /damaged by a transfer as text/],
    ['cut in the contents', good.subarray(0, 3000), /cut short or damaged/],
    ['cut in the data', good.subarray(0, good.length - 800), /segment of body 399: is not within the file/],
    ['ecliptic', spkFile([{ ...LINES[0]!, frame: 17 }, ...LINES.slice(1)]), /segment of body 3: is in frame 17/],
    ['without the Earth', spkFile(LINES.filter(({ target }) => target !== 399)), /from the Earth \(body 399\)/],
    ['without the way', spkFile(LINES.filter(({ target }) => target !== 3)), /from the Earth \(body 399\)/],
    ['without the Sun', spkFile(LINES.filter(({ target }) => target !== 10)), /from the Sun \(body 10\)/],
    [
      'in a ring',
      spkFile(LINES.map((array) => (array.target === 3 ? { ...array, centre: 399 } : array))),
      /from the Earth/,
    ],
    [
      'with NaN',
      spkFile([{ ...LINES[0]!, records: repeat(5, [Number.NaN, 1, 1, 1, 1, 1]) }, ...LINES.slice(1)]),
      /no number/,
    ],
  ])('%s', (_, bytes, message) => {
    expect(problemOf(bytes)).toMatch(message);
  });

  it('never throws nor gives numbers that are none, whatever byte is changed', () => {
    for (let at = 0; at < good.length; at += 7) {
      const bytes = good.slice();
      bytes[at]! ^= 0x81;
      const result = readSpkKernel(inMemory(bytes), ALL);
      if ('problem' in result) continue;
      const found = earthAndSunFromKernel(result.kernel, { day: 51_550, fraction: 0.3 });
      if (!('reason' in found)) expect(found.earthKm.every(Number.isFinite)).toBe(true);
    }
  });
});

const scratch = mkdtempSync(join(tmpdir(), 'spinvigil-spk-'));
afterAll(() => rmSync(scratch, { recursive: true }));

/** Debian's python3-jplephem, an independent reader of SPK kernels. */
const PYTHON = '/usr/bin/python3';
const READ_THERE = `
import json, sys
from jplephem.spk import SPK
kernel = SPK.open(sys.argv[1])
def at(t):
    days, fraction = 2400000.5 + t[0], t[1]
    earth = [kernel[0, 3].compute_and_differentiate(days, fraction), kernel[3, 399].compute_and_differentiate(days, fraction)]
    sun = kernel[0, 10].compute(days, fraction)
    return [list(earth[0][0] + earth[1][0]), list((earth[0][1] + earth[1][1]) / 86400.0), list(sun[:3])]
print(json.dumps([at(t) for t in json.loads(sys.argv[2])]))
`;

function jplephemIsThere(): boolean {
  try {
    execFileSync(PYTHON, ['-c', 'import jplephem.spk'], { stdio: 'ignore' });
    return true;
  } catch {
    return false;
  }
}

const thereIsJplephem = jplephemIsThere();
if (!thereIsJplephem) {
  console.warn(
    'SKIPPED: SPK kernels against python3-jplephem; install the Debian packages python3-jplephem and python3-numpy',
  );
}

describe.skipIf(!thereIsJplephem)('against python3-jplephem', () => {
  it.each(BOTH_ORDERS)('both read the same kernel the same, to 5 ps of light time: %o', (order) => {
    const file = join(scratch, `${order.littleEndian}.bsp`);
    const bytes = spkFile(builtInArrays(58_000, 58_100), order);
    writeFileSync(file, bytes);
    const kernel = read(bytes);
    const dates = Array.from({ length: 50 }, (_, i) => addSeconds({ day: 58_001 + i, fraction: 0 }, i * 1777.77));
    const times = JSON.stringify(dates.map(({ day, fraction }) => [day, fraction]));
    const theirs = JSON.parse(execFileSync(PYTHON, ['-c', READ_THERE, file, times], { encoding: 'utf8' }));
    let worst = 0;
    for (const [i, date] of dates.entries()) {
      const { earthKm, earthKmPerS, sunKm } = motion(kernel, date);
      const [earth, velocity, sun] = theirs[i] as [number[], number[], number[]];
      for (let k = 0; k < 3; k++) {
        worst = Math.max(worst, Math.abs(earthKm[k]! - earth[k]!), Math.abs(sunKm[k]! - sun[k]!));
        expect(earthKmPerS[k]).toBeCloseTo(velocity[k]!, 9);
      }
    }
    console.info(
      `against python3-jplephem: ${dates.length} dates, largest difference ${(worst / LIGHT_KM_PER_NS).toExponential(1)} ns`,
    );
    expect(worst / LIGHT_KM_PER_NS).toBeLessThan(5e-3);
  });
});

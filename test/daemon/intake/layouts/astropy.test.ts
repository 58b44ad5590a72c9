import { readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { readFits } from '../../../../daemon/intake/layouts/fits.ts';
import { readVotable } from '../../../../daemon/intake/layouts/votable.ts';

// Files written by astropy 5.2.1 (Debian 12) with test/data/astropy/make.py, which states the same numbers.
const readFile = (name: string) => {
  const bytes = readFileSync(new URL(`../../../data/astropy/${name}`, import.meta.url));
  return name.endsWith('.fits') ? readFits(bytes) : readVotable(bytes);
};

const COMMON = [
  {
    pulsar: 'KR 0417+31',
    uncertaintyUs: 38.2,
    frequencyMhz: 1400.25,
    site: 'ridge',
    receiver: 'ridge-1400',
    pulseNumber: -17,
    signalToNoise: 23.5,
  },
  {
    pulsar: 'KR 0009-1',
    uncertaintyUs: 0.125,
    frequencyMhz: Number.POSITIVE_INFINITY,
    site: 'coast',
    receiver: '',
    pulseNumber: 9007199254740991,
    signalToNoise: null,
  },
  {
    pulsar: 'KR 0417+31',
    uncertaintyUs: 7,
    frequencyMhz: 350.1,
    site: 'ridge',
    receiver: 'L',
    pulseNumber: null,
    signalToNoise: 8.1,
  },
];
const TEXTS = ['60975.8912345678901234', '60976.0000000000000001', '61000.9999999999999999'];
/** What the two columns hold: the day, and the 64-bit number nearest to the fraction. */
const PARTS = [
  { day: 60975, fraction: Number('0.8912345678901234') },
  { day: 60976, fraction: 1e-16 },
  { day: 61000, fraction: 0.9999999999999999 },
];

describe('files written by astropy', () => {
  it.each(['text.fits', 'tabledata.vot', 'binary2.vot'])('%s: every quantity, every digit of the time', (name) => {
    const { rows, rejects, fault, ignoredColumns, warnings } = readFile(name);
    expect({ rejects, fault, ignoredColumns, warnings }).toEqual({
      rejects: [],
      fault: null,
      ignoredColumns: [],
      warnings: [],
    });
    expect(rows).toEqual(
      COMMON.map((row, i) => ({
        ...row,
        line: i + 1,
        timeText: TEXTS[i],
        timeScale: 'UTC',
        time: PARTS[i],
        note: null,
      })),
    );
  });

  it.each(['two-columns.fits', 'two-columns-binary2.vot'])('%s: a date in two columns, uncertainties in s', (name) => {
    const { rows, rejects, warnings } = readFile(name);
    expect(rejects).toEqual([]);
    expect(rows).toMatchObject(COMMON.map((row, i) => ({ ...row, time: PARTS[i] })));
    expect(warnings).toEqual([
      expect.stringContaining('the column uncertainty_us states the unit s, and is read in it'),
    ]);
  });

  it('scaled.fits: the third HDU, whole numbers scaled exactly, nulls, a unit, an array nobody asked for', () => {
    const { rows, rejects, ignoredColumns, warnings } = readFile('scaled.fits');
    expect(rejects).toEqual([]);
    expect(rows).toMatchObject([
      { pulsar: 'KR 0417+31', timeText: TEXTS[0], uncertaintyUs: 38.2, frequencyMhz: 1400.25, pulseNumber: 5 },
      { pulsar: 'KR 0009-1', timeText: TEXTS[1], uncertaintyUs: 0.1, frequencyMhz: 1400.25, pulseNumber: null },
      { pulsar: 'KR 0417+31', timeText: TEXTS[2], uncertaintyUs: 7, frequencyMhz: 350.1, pulseNumber: 7 },
    ]);
    expect(ignoredColumns).toEqual(['profile']);
    expect(warnings).toEqual(['HDU 3: the column frequency_mhz states the unit kHz, and is read in it']);
  });
});

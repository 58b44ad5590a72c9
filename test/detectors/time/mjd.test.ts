import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { compareMjd, daysBetween, formatMjd, normalMjd, parseMjd } from '../../../detectors/time/mjd.ts';

const date = fc.record({
  day: fc.integer({ min: 0, max: 99_999 }),
  fraction: fc.double({ min: 0, max: 1, maxExcluded: true, noNaN: true }),
});

describe('parseMjd', () => {
  it('keeps digits that one double would lose', () => {
    const a = parseMjd('60123.12345678901234567');
    const b = parseMjd('60123.12345678901239567');
    expect(daysBetween(b!, a!) / 5e-14).toBeCloseTo(1, 2);
    expect(60123.12345678901 - 60123.12345678901).toBe(0);
  });

  it.each([
    '',
    ' 60000',
    '60000 ',
    '6e4',
    '+60000',
    '-5',
    '60000.',
    '.5',
    '60_000',
    '60,000',
    '0x10',
    'NaN',
    'Infinity',
    '６0000',
    '12345678',
  ])('refuses "%s"', (text) => expect(parseMjd(text)).toBeNull());

  it('rounds a fraction of all nines up to the next day', () => {
    expect(parseMjd('59999.99999999999999999999')).toEqual({ day: 60_000, fraction: 0 });
  });
});

describe('formatMjd', () => {
  it('there and back: the same date within 1e-17 d', () => {
    fc.assert(
      fc.property(date, (t) => {
        const back = parseMjd(formatMjd(t))!;
        expect(Math.abs(daysBetween(back, t))).toBeLessThanOrEqual(1e-17);
      }),
    );
  });

  it('has at least 16 decimals', () => {
    expect(formatMjd({ day: 60_000, fraction: 0.5 }, 3)).toBe('60000.5000000000000000');
    expect(formatMjd({ day: 60_000, fraction: 1 - 2 ** -53 }, 3)).toBe('60000.9999999999999999');
  });
});

describe('normalMjd', () => {
  it('puts the fraction into [0, 1) and keeps the order', () => {
    fc.assert(
      fc.property(date, fc.double({ min: -3, max: 3, noNaN: true }), (t, shift) => {
        const moved = normalMjd(t.day, t.fraction + shift);
        expect(moved.fraction).toBeGreaterThanOrEqual(0);
        expect(moved.fraction).toBeLessThan(1);
        if (shift > 1e-12) expect(compareMjd(moved, t)).toBeGreaterThan(0);
      }),
    );
  });
});

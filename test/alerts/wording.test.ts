import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { TEXT_COLUMNS, table, width, wrap } from '../../alerts/text.ts';
import { rivalSizes, whatToObserve } from '../../alerts/wording/advice.ts';
import { civilEpoch, dateOfMjd, epochText, isoDay, momentText } from '../../alerts/wording/dates.ts';
import { NOT_CONSTRAINED, percent, plain, power, quantity } from '../../alerts/wording/numbers.ts';
import { eventName, falseAlertText } from '../../alerts/wording/phrases.ts';
import { eventSheet, sizeText } from '../../alerts/wording/sheet.ts';
import { EXPLANATIONS, type Interval } from '../../detectors/steps/pulsarEvent.ts';
import { GLITCH, SITE_STEP, samplePicture } from './samples.ts';

const inPowers = (value: number | null, interval68: Interval | null) =>
  quantity({ value, interval68, unit: '', scale: 'power' });
const inHertz = (value: number | null, interval68: Interval | null) =>
  quantity({ value, interval68, unit: 'Hz', scale: 'prefix' });

describe('numbers with uncertainties', () => {
  it.each([
    [3.2e-9, [3.0e-9, 3.4e-9], '(3.20 ± 0.20) × 10⁻⁹'],
    [3.213e-6, [3.2129e-6, 3.2131e-6], '(3.21300 ± 0.00010) × 10⁻⁶'],
    [17e-9, [16.5e-9, 17.5e-9], '(17.0 ± 0.5) × 10⁻⁹'],
    [-2.4e-9, [-2.7e-9, -2.1e-9], '(−2.40 ± 0.30) × 10⁻⁹'],
    [12e-3, [10e-3, 15e-3], '(12.0 +3.0 −2.0) × 10⁻³'],
    [0.87, [0.82, 0.92], '0.87 ± 0.05'],
  ] as const)('%f in %j reads %s', (value, interval, text) => {
    expect(inPowers(value, interval)).toBe(text);
  });

  it.each([
    [2.03e-8, [1.9e-8, 2.16e-8], '20.3 ± 1.3 nHz'],
    [1.25, [1.24, 1.26], '1.250 ± 0.010 Hz'],
    [3e-15, [2e-15, 4e-15], '0.0030 ± 0.0010 pHz'],
  ] as const)('%f Hz in %j reads %s', (value, interval, text) => {
    expect(inHertz(value, interval)).toBe(text);
  });

  // Rounding rule of the Particle Data Group (Review of Particle Physics, Introduction, "Rounding": 0.827 ± 0.119 → 0.83 ± 0.12,
  // 0.827 ± 0.367 → 0.8 ± 0.4), its own worked examples, from memory.
  it.each([
    [0.827, 0.119, '0.83 ± 0.12'],
    [0.827, 0.367, '0.8 ± 0.4'],
    [5.2, 0.96, '5.2 ± 1.0'],
  ])('%f with %f rounds to %s', (value, error, text) => {
    expect(inPowers(value, [value - error, value + error])).toBe(text);
  });

  it('says so when the sign is not known, the interval is missing, or there is no value', () => {
    expect(inPowers(2.7e-3, [-1e-3, 6.3e-3])).toBe('not yet constrained (68 %: (−1.0 to +6.3) × 10⁻³)');
    expect(inPowers(null, null)).toBe(NOT_CONSTRAINED);
    expect(inPowers(Number.NaN, null)).toBe(NOT_CONSTRAINED);
    expect(inPowers(1e-9, [-Infinity, Infinity])).toBe(NOT_CONSTRAINED);
    expect(inPowers(1.234e-9, null)).toBe('1.23 × 10⁻⁹ (uncertainty not known)');
  });

  it('a stated value and uncertainty can be read back', () => {
    const size = fc.tuple(
      fc.double({ min: 1.01, max: 9.99, noNaN: true }),
      fc.integer({ min: -11, max: -5 }),
      fc.double({ min: 0.01, max: 0.5, noNaN: true }),
    );
    fc.assert(
      fc.property(size, fc.boolean(), ([mantissa, decade, relative], down) => {
        const value = (down ? -1 : 1) * mantissa * 10 ** decade;
        const error = Math.abs(value) * relative;
        const text = inPowers(value, [value - error, value + error]);
        const [, readValue = '', readError = '', exponent = ''] =
          /^\(([−\d.]+) ± ([\d.]+)\) × 10([⁻⁰¹²³⁴⁵⁶⁷⁸⁹]+)$/.exec(text) ?? [];
        const power = Number([...exponent].map((c) => (c === '⁻' ? '-' : '⁰¹²³⁴⁵⁶⁷⁸⁹'.indexOf(c))).join(''));
        expect(Math.abs(Number(readValue.replace('−', '-')) * 10 ** power - value)).toBeLessThanOrEqual(0.16 * error);
        expect(Math.abs(Number(readError) * 10 ** power - error)).toBeLessThanOrEqual(0.16 * error);
      }),
      { seed: 1 },
    );
  });

  it.each([
    [0.9982, '99.82 %'],
    [0.99999, '> 99.99 %'],
    [1, '> 99.99 %'],
    [0.5, '50 %'],
    [0.953, '95.3 %'],
    [0.0011, '0.11 %'],
    [0, '< 0.01 %'],
  ])('probability %f reads %s', (p, text) => expect(percent(p)).toBe(text));

  it('plain numbers keep a real minus sign', () => {
    expect(plain(-31.24, 3)).toBe('−31.2');
    expect(plain(0, 3)).toBe('0.00');
    expect(power(2.13e-9)).toBe('2.1 × 10⁻⁹');
    expect(falseAlertText(1e-9)).toBe('less than one in a thousand years by noise alone at this level');
    expect(falseAlertText(0.1)).toBe('about one in 10 years by noise alone at this level');
    expect(falseAlertText(2)).toBe('about 2.0 a year by noise alone at this level');
  });
});

describe('dates', () => {
  // MJD 51544.5 is 2000-01-01 12:00 and MJD 0 is 1858-11-17 (IAU 1997 resolution B1; Explanatory Supplement to the Astronomical Almanac).
  it('MJD and the calendar agree at published points', () => {
    expect(dateOfMjd(51_544.5).toISOString()).toBe('2000-01-01T12:00:00.000Z');
    expect(dateOfMjd(0).toISOString()).toBe('1858-11-17T00:00:00.000Z');
  });

  it('an epoch has its scale, and no more digits than it knows', () => {
    expect(epochText(60_123.41, [60_123.1, 60_123.8])).toBe('MJD 60123.41 +0.39 −0.31 (TDB)');
    expect(epochText(60_123.41, [60_121.4, 60_125.4])).toBe('MJD 60123.4 ± 2.0 (TDB)');
    expect(epochText(60_123.4, [60_123.4, 60_123.4])).toBe('MJD 60123.40 (TDB)');
  });

  it('a civil date is as fine as the epoch, and in the zone of the observatory', () => {
    expect(civilEpoch(60_123.41, [60_123.1, 60_123.8], 'Europe/Berlin')).toBe('28 June 2023 UTC');
    expect(civilEpoch(60_123.41, [60_121, 60_125], 'Europe/Berlin')).toBe('26 June 2023 to 30 June 2023 UTC');
    expect(civilEpoch(60_123.41, [60_123.4, 60_123.42], 'Europe/Berlin')).toBe(
      '28 June 2023, about 09:50 UTC (11:50 Europe/Berlin)',
    );
    expect(civilEpoch(60_123.98, [60_123.97, 60_123.99], 'Asia/Tokyo')).toBe(
      '28 June 2023, about 23:31 UTC (29 June 2023, 08:31 Asia/Tokyo)',
    );
    expect(momentText(new Date('2023-12-31T23:30:00Z'), 'Europe/Berlin')).toBe(
      '2024-01-01 00:30 Europe/Berlin (23:30 UTC)',
    );
    expect(isoDay(new Date('2023-12-31T23:30:00Z'), 'UTC')).toBe('2023-12-31');
  });
});

describe('what an event is called', () => {
  it('a confirmed event is a candidate until a reviewer accepts it', () => {
    expect(eventName(GLITCH)).toBe('candidate glitch');
    expect(eventName({ ...GLITCH, state: 'accepted' })).toBe('glitch');
    expect(eventName({ ...GLITCH, state: 'suspected' })).toBe('suspected glitch');
    expect(eventSheet(GLITCH, null, 'UTC').caution).toMatch(/vetted/);
    expect(eventSheet({ ...GLITCH, state: 'accepted' }, null, 'UTC').caution).toBe('');
  });

  it('every explanation has a sentence, a size or none, and no row says "null" or "NaN"', () => {
    for (const explanation of EXPLANATIONS) {
      for (const base of [GLITCH, SITE_STEP]) {
        const sheet = eventSheet({ ...base, explanation }, samplePicture(), 'Europe/Berlin');
        expect(sheet.meaning.length).toBeGreaterThan(20);
        expect(JSON.stringify(sheet)).not.toMatch(/null|NaN|undefined|Infinity/);
      }
    }
    expect(sizeText(GLITCH)).toBe('Δν/ν = (3.20 ± 0.21) × 10⁻⁹');
    expect(sizeText(SITE_STEP)).toBe('Δt = 104.2 ± 2.1 µs');
    expect(sizeText({ ...GLITCH, deltaNuOverNuInterval68: [-1e-9, 5e-9] })).toBe('Δν/ν not yet constrained');
    expect(sizeText({ ...GLITCH, deltaNuOverNu: null, deltaNuDotOverNuDotInterval68: [1e-3, 4e-3] })).toBe(
      'Δν̇/ν̇ = (2.7 +1.3 −1.7) × 10⁻³',
    );
  });
});

describe('what to observe next', () => {
  it('tonight, while only few arrivals stand after the event', () => {
    expect(whatToObserve(GLITCH, samplePicture({ daysAfter: 2 })).join(' ')).toMatch(/^Tonight/);
    expect(whatToObserve(GLITCH, samplePicture({ daysAfter: 60 })).join(' ')).not.toMatch(/Tonight/);
  });

  it('half a turn apart in phase tells two sizes apart: 12 hours for one turn a sidereal day', () => {
    // 1 / 86 164.09 s: the frequency step that a source seen once a sidereal day cannot tell from none
    const alias = 1 / 86_164.09;
    const event = {
      ...GLITCH,
      aliases: [
        { deltaNuHz: 2.03e-8, probability: 0.7 },
        { deltaNuHz: 2.03e-8 - alias, probability: 0.3 },
      ],
    };
    expect(whatToObserve(event, samplePicture()).join(' ')).toContain('about 12.0 hours apart');
    expect(rivalSizes(event)).toHaveLength(1);
    expect(eventSheet(event, null, 'UTC').rows.find((r) => r.label === 'Or Δν')?.value).toBe(
      '−11.6 µHz (30 %): whole turns not settled',
    );
  });

  it('nothing after a withdrawal, or for the site', () => {
    expect(whatToObserve({ ...GLITCH, state: 'withdrawn' }, samplePicture())).toEqual([]);
    expect(whatToObserve(SITE_STEP, null)).toEqual([]);
  });
});

describe('plain text', () => {
  it('no line is over 78 columns, and no word is lost', () => {
    fc.assert(
      fc.property(fc.string({ unit: 'grapheme', maxLength: 400 }), fc.string({ maxLength: 40 }), (value, label) => {
        const text = table([{ label: label.replace(/\s/g, '').slice(0, 20), value }]);
        for (const line of text.split('\n')) expect(width(line)).toBeLessThanOrEqual(TEXT_COLUMNS);
        const letters = (s: string) => s.replace(/[^a-z]/g, '');
        expect(letters(wrap(value))).toBe(letters(value));
      }),
      { seed: 2 },
    );
  });
});

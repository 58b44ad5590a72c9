import { describe, expect, test } from 'vitest';
import { civilTime, clockStepWatch, instantOf, mjdOf } from '../../daemon/clock.ts';

// Daylight-saving dates: Directive 2000/84/EC (Berlin); Lord Howe Island moves by half an hour (IANA time zone database).

describe('civil time', () => {
  test.each([
    ['2026-03-29T00:59:59Z', 'Europe/Berlin', '2026-03-29 01:59:59'],
    ['2026-03-29T01:00:00Z', 'Europe/Berlin', '2026-03-29 03:00:00'],
    ['2026-10-25T00:30:00Z', 'Europe/Berlin', '2026-10-25 02:30:00'],
    ['2026-10-25T01:30:00Z', 'Europe/Berlin', '2026-10-25 02:30:00'],
    ['2026-06-10T23:30:00Z', 'Pacific/Auckland', '2026-06-11 11:30:00'],
    ['2026-06-10T00:00:00Z', 'UTC', '2026-06-10 00:00:00'],
  ])('%s in %s', (at, zone, shown) => {
    const { date, time } = civilTime(new Date(at), zone);
    expect(`${date} ${time}`).toBe(shown);
  });

  test('an unknown zone is an error', () => {
    expect(() => civilTime(new Date(0), 'Mars/Olympus')).toThrow(RangeError);
  });
});

describe('the instant of a civil time', () => {
  test.each([
    ['2026-06-10', '08:00:00', 'Europe/Berlin', '2026-06-10T06:00:00.000Z'],
    ['2026-01-10', '08:00:00', 'Europe/Berlin', '2026-01-10T07:00:00.000Z'],
    ['2026-03-29', '02:30:00', 'Europe/Berlin', '2026-03-29T01:00:00.000Z'],
    ['2026-10-25', '02:30:00', 'Europe/Berlin', '2026-10-25T00:30:00.000Z'],
    ['2026-10-04', '02:15:00', 'Australia/Lord_Howe', '2026-10-03T15:30:00.000Z'],
    ['2026-06-11', '11:30:00', 'Pacific/Auckland', '2026-06-10T23:30:00.000Z'],
    ['2026-06-10', '12:00:00', 'Pacific/Pago_Pago', '2026-06-10T23:00:00.000Z'],
  ])('%s %s in %s', (date, time, zone, instant) => {
    expect(instantOf({ date, time }, zone).toISOString()).toBe(instant);
  });
});

test('MJD: 2000-01-01 12:00 is 51544.5 (IAU, the epoch J2000.0)', () => {
  expect(mjdOf(new Date('2000-01-01T12:00:00Z'))).toBe(51_544.5);
});

test('B6: a wall clock that is set shows, one that runs does not', () => {
  let wall = Date.parse('2026-06-10T08:00:00Z');
  let monotonic = 0;
  const step = clockStepWatch({ now: () => new Date(wall), monotonicMs: () => monotonic });
  wall += 60_000;
  monotonic += 60_010;
  expect(step()).toBeNull();
  wall -= 3_600_000;
  expect(step()).toBe(-3600);
  wall += 86_400_000;
  monotonic += 60_000;
  expect(step()).toBe(86_340);
  expect(step()).toBeNull();
});

import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { type ClockTable, clockCorrection, parseClockTable } from '../../../detectors/time/siteClock.ts';

function tableOf(text: string): ClockTable {
  const parsed = parseClockTable(text, 'ridge');
  if ('problems' in parsed) throw new Error(parsed.problems[0]?.message);
  return parsed.table;
}

const table = tableOf('# maser against GPS\nmjd,add_seconds\n59000,1e-6\n59010,3e-6\n59010,-2e-6\n59020,-2e-6\n');
const at = (day: number, fraction = 0) => clockCorrection(table, { day, fraction });

describe('clockCorrection', () => {
  it('draws straight lines', () => {
    expect(at(59_005).seconds).toBeCloseTo(2e-6, 15);
    expect(at(59_002, 0.5).seconds).toBeCloseTo(1.5e-6, 15);
    expect(at(59_015)).toEqual({ seconds: -2e-6, quality: 'ok', reason: '' });
  });

  it('takes a step at its own instant', () => {
    expect(at(59_009, 0.999_999_999).seconds).toBeCloseTo(3e-6, 12);
    expect(at(59_010).seconds).toBe(-2e-6);
  });

  it('covers both ends and marks what lies beyond, holding the end value', () => {
    expect(at(59_000)).toMatchObject({ seconds: 1e-6, quality: 'ok' });
    expect(at(59_020)).toMatchObject({ seconds: -2e-6, quality: 'ok' });
    expect(at(58_999, 0.9)).toMatchObject({ seconds: 1e-6, quality: 'extrapolated' });
    expect(at(59_020, 0.1)).toMatchObject({ seconds: -2e-6, quality: 'extrapolated' });
    expect(at(59_400).reason).toBe('clock table ridge ended at MJD 59020; its end value is held');
  });

  it('stays between the rows on either side', () => {
    const row = fc.tuple(fc.integer({ min: 50_000, max: 50_100 }), fc.double({ min: -1e-3, max: 1e-3, noNaN: true }));
    fc.assert(
      fc.property(
        fc.uniqueArray(row, { minLength: 1, selector: ([mjd]) => mjd }),
        fc.double({ min: 49_990, max: 50_110, noNaN: true }),
        (rows, mjd) => {
          rows.sort((a, b) => a[0] - b[0]);
          const some: ClockTable = {
            name: 'some',
            mjd: Float64Array.from(rows, (r) => r[0]),
            addSeconds: Float64Array.from(rows, (r) => r[1]),
          };
          const { seconds } = clockCorrection(some, { day: Math.floor(mjd), fraction: mjd - Math.floor(mjd) });
          const left = rows.findLast(([date]) => date <= mjd) ?? rows[0]!;
          const right = rows.find(([date]) => date > mjd) ?? left;
          expect(seconds).toBeGreaterThanOrEqual(Math.min(left[1], right[1]) - 1e-18);
          expect(seconds).toBeLessThanOrEqual(Math.max(left[1], right[1]) + 1e-18);
        },
      ),
    );
  });
});

describe('parseClockTable', () => {
  it('puts rows that are out of order in their place and names them', () => {
    const parsed = parseClockTable('mjd,add_seconds\n59002,2\n59000,0\n59001,1', 'ridge');
    expect(parsed).toMatchObject({ warnings: [{ line: 3 }, { line: 4 }] });
    expect('table' in parsed && [...parsed.table.addSeconds]).toEqual([0, 1, 2]);
  });

  it('takes Windows line ends, a byte-order mark, blanks and comments', () => {
    const parsed = tableOf('\uFEFFmjd, add_seconds\r\n\r\n# note\r\n59000 , -1.5e-6\r\n');
    expect([...parsed.mjd, ...parsed.addSeconds]).toEqual([59_000, -1.5e-6]);
  });

  it.each([
    ['', 1, /no rows/],
    ['59000,1e-6', 1, /header "mjd,add_seconds"/],
    ['mjd,add_seconds\n59000', 2, /2 columns/],
    ['mjd,add_seconds\n59000,1,2', 2, /2 columns/],
    ['mjd,add_seconds\n59000,NaN', 2, /add_seconds: "NaN" is not a number/],
    ['mjd,add_seconds\n0x10,1e-6', 2, /mjd: "0x10"/],
    ['mjd,add_seconds\n59000,', 2, /add_seconds: ""/],
    ['mjd,add_seconds\n59000,1e400', 2, /not a number/],
    ['mjd,add_seconds\n59000,59001', 2, /more than an hour/],
    ['mjd,add_seconds\n59001,0\n59001,1\n59001,2', 4, /three times/],
  ])('refuses %j and names the line', (text, line, message) => {
    expect(parseClockTable(text, 'ridge')).toMatchObject({
      problems: [{ line, message: expect.stringMatching(message) }],
    });
  });

  it('names every bad row, not just the first', () => {
    const parsed = parseClockTable('mjd,add_seconds\nx,0\n59000,0\ny,0\n', 'ridge');
    expect('problems' in parsed && parsed.problems.map((problem) => problem.line)).toEqual([2, 4]);
  });
});

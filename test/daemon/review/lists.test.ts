import { describe, expect, test } from 'vitest';
import { eventCharts } from '../../../daemon/review/charts/eventCharts.ts';
import { intervalTable } from '../../../daemon/review/pages/intervals.ts';
import { pulsarQuery, pulsarsPage } from '../../../daemon/review/pages/pulsars.ts';
import { sampleEvent, samplePicture, samplePulsar } from '../../support/reviewDesk.ts';
import { startSampleSite } from './reviewSite.ts';

describe('the list of pulsars', () => {
  const pulsars = [
    samplePulsar({ pulsar: 'KR 0417+31', deltaNuOverNu90: 3e-9 }),
    samplePulsar({ pulsar: 'KR 1118+62', deltaNuOverNu90: null, limitReason: 'alerts are held', state: 'count open' }),
    samplePulsar({ pulsar: 'KR 2210-05', deltaNuOverNu90: 1e-9, state: 'candidate', eventId: 'e' }),
  ];
  const names = (query: Record<string, string>) =>
    [...String(pulsarsPage(pulsars, pulsarQuery(query))).matchAll(/<tr data-text="([^"]*)"[^>]*?( hidden)?>/g)]
      .filter(([, , hidden]) => hidden === undefined)
      .map(([, text]) => text!.slice(0, 10));

  test('shows the most urgent first, sorts by a column both ways with the unknown last, and filters', () => {
    expect(names({})).toEqual(['kr 2210-05', 'kr 1118+62', 'kr 0417+31']);
    expect(names({ sort: 'limit' })).toEqual(['kr 2210-05', 'kr 0417+31', 'kr 1118+62']);
    expect(names({ sort: 'limit', order: 'descending' })).toEqual(['kr 0417+31', 'kr 2210-05', 'kr 1118+62']);
    expect(names({ text: 'KR 1' })).toEqual(['kr 1118+62']);
    expect(names({ text: 'candidate' })).toEqual(['kr 2210-05']);
    expect(names({ state: 'count open' })).toEqual(['kr 1118+62']);
  });

  test('takes an address that nobody made for the plain list', () => {
    expect(names({ sort: '__proto__', order: 'x', state: 'nonsense' })).toEqual(names({}));
    expect(pulsarQuery({ text: 'x'.repeat(5000) }).text).toHaveLength(100);
  });
});

describe('the panels of an event', () => {
  const picture = samplePicture();
  const [deviation, residual, frequency, spinDown] = eventCharts(picture);

  test('show every arrival, before and after the fit, and both tracks with what was measured', () => {
    expect(deviation!.marks).toHaveLength(picture.points.length);
    expect(deviation!.marks.filter(({ kind }) => kind === 'aside')).toHaveLength(1);
    const used = residual!.marks.filter(({ kind }) => kind !== 'aside');
    const chiSquare = used.reduce((sum, { y, error }) => sum + (y / error) ** 2, 0);
    // The sample's own noise: about one a point.
    expect(chiSquare / used.length).toBeGreaterThan(0.5);
    expect(chiSquare / used.length).toBeLessThan(2);
    expect(frequency!.curve.at(-1)![1]).toBeCloseTo(108, 6);
    expect(spinDown!.curve.at(-1)![1]).toBeCloseTo(-1.1, 6);
    expect(frequency!.marks[0]!.says).toMatch(/^MJD \d+\.\d+, 2026-\d\d-\d\d: Δν .* ± .* nHz$/);
  });

  test('leave out the track of ν̇ that an older record does not have', () => {
    const { spinDownTrack: _track, spinDownFit: _fit, ...older } = picture;
    expect(eventCharts(older).map(({ id }) => id)).toEqual(['chart-deviation', 'chart-residual', 'chart-frequency']);
  });
});

describe('the table of measured values', () => {
  const text = (change: Parameters<typeof sampleEvent>[0]) => String(intervalTable(sampleEvent(change)));

  test('states both intervals in one unit, to the digits of the error', () => {
    expect(text({})).toContain('108.0 × 10⁻⁹ Hz');
    expect(text({})).toContain('(105.0 to 111.0) × 10⁻⁹ Hz');
    expect(text({})).toContain('(102.0 to 114.0) × 10⁻⁹ Hz');
  });

  test('says “not yet constrained” where nothing is known or the sign is not', () => {
    const open = text({ deltaNuDot: null, deltaNuDotInterval68: null, deltaNuHzInterval68: [-1e-8, 2e-7] });
    expect(open.split('not yet constrained').length).toBeGreaterThan(2);
    expect(open).not.toContain('>108.0 × 10⁻⁹ Hz');
  });

  test('an event names what it rests on, and leads on to the next', async () => {
    const { url } = await startSampleSite();
    const page = await (await fetch(`${url}events/kr-0417-61370`)).text();
    expect(page).toContain('68 arrivals from 68 files');
    expect(page).toContain('2026/night-3.csv');
    expect(page).toContain('What more observations would settle');
  });
});

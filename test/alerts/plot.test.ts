import { describe, expect, it } from 'vitest';
import { DARK_PALETTE, eventSvg, LIGHT_PALETTE, type PlotPalette, renderPng } from '../../alerts/index.ts';
import { ticksOf } from '../../alerts/plot/scale.ts';
import { interpolate, viewOf } from '../../alerts/plot/view.ts';
import { expectGolden } from './golden.ts';
import { samplePicture } from './samples.ts';
import { find, parseXml } from './wellFormed.ts';

const WORDS = { title: 'KR 0417+31: candidate glitch', subtitle: 'Δν/ν = (3.20 ± 0.21) × 10⁻⁹' };

describe('the picture of an event', () => {
  it('GOLDEN: light and dark, to the byte', () => {
    expectGolden('event-light.svg', eventSvg(samplePicture(), WORDS));
    expectGolden('event-dark.svg', eventSvg(samplePicture({ deltaNuHz: 9.1e-6, daysAfter: 3 }), WORDS, DARK_PALETTE));
  });

  it('does not depend on the order of the arrivals', () => {
    const picture = samplePicture();
    expect(eventSvg({ ...picture, points: picture.points.toReversed() }, WORDS)).toBe(eventSvg(picture, WORDS));
  });

  it('marks every arrival in view: discs before, diamonds after, hollow where set aside', () => {
    const picture = samplePicture();
    const view = viewOf(picture);
    const panels = find(parseXml(eventSvg(picture, WORDS)), 'svg');
    const phase = panels[0]!;
    const filled = (name: string) =>
      phase.children.filter((c) => c.name === name && c.attributes.get('fill') !== LIGHT_PALETTE.panel);
    expect(filled('circle')).toHaveLength(view.points.filter((p) => p.used && p.mjd <= picture.epochMjd).length);
    expect(filled('path')).toHaveLength(view.points.filter((p) => p.used && p.mjd > picture.epochMjd).length);
    expect(phase.children.filter((c) => c.attributes.get('fill') === LIGHT_PALETTE.panel)).toHaveLength(1);
    // the residual panel leaves nothing out that has a fit to compare with
    expect(panels[1]!.children.filter((c) => c.name === 'circle' || c.name === 'path')).toHaveLength(
      view.points.length,
    );
  });

  it('an arrival that the fit meets stands on the zero line of the residuals', () => {
    const picture = samplePicture();
    const exact = picture.points.map((p) => ({
      ...p,
      deviationTurns:
        interpolate(
          picture.fit.map((f) => ({ mjd: f.mjd, value: f.deviationTurns })),
          p.mjd,
        ) ?? 0,
    }));
    const residuals = find(parseXml(eventSvg({ ...picture, points: exact }, WORDS)), 'svg')[1]!;
    const heights = residuals.children.filter((c) => c.name === 'circle').map((c) => Number(c.attributes.get('cy')));
    expect(new Set(heights).size).toBe(1);
    expect(heights[0]).toBe(856);
  });

  it('is well-formed and finite for odd pictures, and escapes names', () => {
    const picture = samplePicture();
    const odd = [
      { ...picture, points: [] },
      { ...picture, points: picture.points.slice(0, 1), fit: [], frequencyTrack: [], frequencyFit: [] },
      { ...picture, epochInterval68: [picture.epochMjd, picture.epochMjd] as const },
      {
        ...picture,
        points: picture.points.map((p) => ({ ...p, used: false, deviationTurns: 0, uncertaintyTurns: 0 })),
      },
    ];
    for (const p of odd) {
      const svg = eventSvg(p, { title: '<script>"\'&\u0000\n', subtitle: '' });
      expect(find(parseXml(svg), 'script')).toHaveLength(0);
      expect(svg).not.toMatch(/NaN|Infinity|undefined/);
    }
  });

  it('becomes a PNG of its own size, the same each time, with letters in it', async () => {
    const svg = eventSvg(samplePicture(), WORDS);
    const png = await renderPng(svg);
    // PNG signature and IHDR (W3C PNG, third edition, §5.2, §11.2.1)
    expect(png.subarray(0, 8)).toEqual(Buffer.from([0x89, 0x50, 0x4e, 0x47, 0x0d, 0x0a, 0x1a, 0x0a]));
    expect([png.readUInt32BE(16), png.readUInt32BE(20)]).toEqual([1080, 1520]);
    expect((await renderPng(svg)).equals(png)).toBe(true);
    const wordless = await renderPng(svg.replace(/<text[^>]*>[^<]*<\/text>/g, ''));
    expect(png.length).toBeGreaterThan(wordless.length + 5_000);
  });
});

describe('colours', () => {
  // WCAG 2.2, "relative luminance" and "contrast ratio"
  const luminance = (hex: string) => {
    const [r, g, b] = [1, 3, 5]
      .map((i) => Number.parseInt(hex.slice(i, i + 2), 16) / 255)
      .map((c) => (c <= 0.04045 ? c / 12.92 : ((c + 0.055) / 1.055) ** 2.4)) as [number, number, number];
    return 0.2126 * r + 0.7152 * g + 0.0722 * b;
  };
  const contrast = (a: string, b: string) =>
    (Math.max(luminance(a), luminance(b)) + 0.05) / (Math.min(luminance(a), luminance(b)) + 0.05);

  it.each([
    ['light', LIGHT_PALETTE],
    ['dark', DARK_PALETTE],
  ] as const)(
    '%s: text at least 4.5 to 1, marks at least 3 to 1 (WCAG 1.4.3, 1.4.11)',
    (_name, palette: PlotPalette) => {
      for (const text of [palette.ink, palette.faint])
        expect(contrast(text, palette.background)).toBeGreaterThanOrEqual(4.5);
      for (const mark of [palette.before, palette.after, palette.fit])
        expect(contrast(mark, palette.panel)).toBeGreaterThanOrEqual(3);
    },
  );
});

describe('ticks', () => {
  it.each([
    [[0, 10], 5, [0, 2, 4, 6, 8, 10]],
    [[-0.0045, 0.0045], 4, [-0.004, -0.002, 0, 0.002, 0.004]],
    [[60_081, 60_139], 5, [60_100, 60_120]],
  ] as const)('%j', (domain, wanted, values) => {
    const ticks = ticksOf(domain, wanted).values;
    expect(ticks.length).toBeGreaterThanOrEqual(3);
    for (const v of values) expect(ticks.some((t) => Math.abs(t - v) < 1e-9)).toBe(true);
  });
});

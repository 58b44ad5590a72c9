import type { EventPicture } from '../../detectors/steps/pulsarEvent.ts';
import { type Markup, markup } from '../markup.ts';
import { dateOfMjd, isoDay } from '../wording/dates.ts';
import { curve, LEFT, line, type PanelBox, panelGround, px, RIGHT, rightAxis, WIDTH, words } from './frame.ts';
import { markOf } from './marks.ts';
import { LIGHT_PALETTE, type PlotPalette } from './palette.ts';
import { domainOf, place, type Scale, tickLabel, ticksOf, unitFor } from './scale.ts';
import { type CurvePoint, clipped, interpolate, type View, viewOf } from './view.ts';

/**
 * The picture of an event: phase deviation with the fit, what the fit leaves, and ν, over one time axis. The same bytes for the same event.
 */
export interface PlotWords {
  /** `KR 0417+31: candidate glitch`. */
  readonly title: string;
  /** The size, under the title. */
  readonly subtitle: string;
}

const HEIGHT = 1520;
const PHASE: PanelBox = { top: 250, bottom: 668 };
const LEFT_OVER: PanelBox = { top: 756, bottom: 956 };
const FREQUENCY: PanelBox = { top: 1044, bottom: 1352 };

interface Canvas {
  readonly picture: EventPicture;
  readonly view: View;
  readonly x: Scale;
  readonly palette: PlotPalette;
}

export function eventSvg(picture: EventPicture, title: PlotWords, palette: PlotPalette = LIGHT_PALETTE): string {
  const view = viewOf(picture);
  const canvas: Canvas = { picture, view, palette, x: { domain: [view.from, view.to], range: [LEFT, RIGHT] } };
  return markup`<svg xmlns="http://www.w3.org/2000/svg" width="${WIDTH}" height="${HEIGHT}" viewBox="0 0 ${WIDTH} ${HEIGHT}" role="img" aria-label="${title.title}. ${title.subtitle}">
<rect width="${WIDTH}" height="${HEIGHT}" fill="${palette.background}"/>
${words(40, 66, title.title, { size: titleSize(title.title), fill: palette.ink, bold: true })}${words(40, 116, title.subtitle, { size: 34, fill: palette.ink })}${legend(canvas)}${phasePanel(canvas)}${leftOverPanel(canvas)}${frequencyPanel(canvas)}${timeAxis(canvas)}</svg>
`.source;
}

/** A long name is set smaller rather than cut: about 0.62 em a letter in bold. */
function titleSize(title: string): number {
  return Math.max(22, Math.min(44, Math.floor((WIDTH - 80) / (0.66 * Math.max(1, [...title].length)))));
}

function legend({ palette, view }: Canvas): Markup {
  const mark = (x: number, after: boolean, used: boolean) =>
    markOf({ x, y: 163, halfError: 0, after, used }, palette, 9);
  const label = (x: number, text: string) => words(x, 173, text, { size: 28, fill: palette.faint });
  const aside = view.points.some((p) => !p.used) ? [mark(806, false, false), label(826, 'set aside')] : [];
  return markup`${mark(50, false, true)}${label(70, 'before')}${mark(206, true, true)}${label(226, 'after')}${line(334, 163, 382, 163, palette.fit, 4)}${label(394, 'fit')}<rect x="468" y="148" width="30" height="30" fill="${palette.epoch}" fill-opacity="0.6"/>
${label(510, 'epoch (68 % band)')}${aside}`;
}

function phasePanel(canvas: Canvas): Markup {
  const { picture, view, palette, x } = canvas;
  const fit = clipped(
    picture.fit.map((p) => ({ mjd: p.mjd, value: p.deviationTurns })),
    view,
  );
  const errors = view.points
    .filter((p) => p.used)
    .flatMap((p) => [p.deviationTurns - p.uncertaintyTurns, p.deviationTurns + p.uncertaintyTurns]);
  const domain = domainOf(
    [0, ...errors, ...view.points.map((p) => p.deviationTurns), ...fit.map((p) => p.value)],
    0.08,
  );
  const y: Scale = { domain, range: [PHASE.bottom, PHASE.top] };
  const seconds = Math.max(Math.abs(domain[0]), Math.abs(domain[1])) / picture.frequencyHz;
  const [factor, unit] = unitFor(seconds, 's');
  const inTime: Scale = {
    domain: [domain[0] / picture.frequencyHz / factor, domain[1] / picture.frequencyHz / factor],
    range: y.range,
  };
  return markup`${panelGround(PHASE, y, 'Phase deviation (late is up)', 'turns', palette, 6)}${rightAxis(PHASE, inTime, unit, palette, 6)}${epochBand(canvas, PHASE)}${fitCurve(canvas, fit, y)}${arrivals(canvas, PHASE, y, (p) => p.deviationTurns)}${axisLine(x, PHASE, palette)}`;
}

/** What the fit leaves. Scaled by the used arrivals: one that was set aside may stand outside. */
function leftOverPanel(canvas: Canvas): Markup {
  const { picture, view, palette, x } = canvas;
  const fit = picture.fit.map((p) => ({ mjd: p.mjd, value: p.deviationTurns }));
  const rest = (p: { readonly mjd: number; readonly deviationTurns: number }) => {
    const value = interpolate(fit, p.mjd);
    return value === null ? null : p.deviationTurns - value;
  };
  const values = view.points
    .filter((p) => p.used)
    .flatMap((p) => {
      const r = rest(p);
      return r === null ? [] : [r - p.uncertaintyTurns, r + p.uncertaintyTurns];
    });
  const reach = Math.max(0, ...values.map(Math.abs)) * 1.15 || 1;
  const y: Scale = { domain: [-reach, reach], range: [LEFT_OVER.bottom, LEFT_OVER.top] };
  const [factor, unit] = unitFor(reach / picture.frequencyHz, 's');
  const most = reach / picture.frequencyHz / factor;
  return markup`${panelGround(LEFT_OVER, y, 'Residual to the fit', 'turns', palette, 4)}${rightAxis(LEFT_OVER, { domain: [-most, most], range: y.range }, unit, palette, 4)}${epochBand(canvas, LEFT_OVER)}${arrivals(canvas, LEFT_OVER, y, rest)}${axisLine(x, LEFT_OVER, palette)}`;
}

function frequencyPanel(canvas: Canvas): Markup {
  const { picture, view, palette, x } = canvas;
  const inView = picture.frequencyTrack.filter((p) => p.mjd >= view.from && p.mjd <= view.to);
  const fit = clipped(
    picture.frequencyFit.map((p) => ({ mjd: p.mjd, value: p.deltaNuHz })),
    view,
  );
  const all = [0, ...inView.map((p) => p.deltaNuHz), ...fit.map((p) => p.value)];
  const errors = inView.flatMap((p) => [p.deltaNuHz - p.uncertaintyHz, p.deltaNuHz + p.uncertaintyHz]);
  const [factor, unit] = unitFor(Math.max(...all.map(Math.abs)), 'Hz');
  const y: Scale = {
    domain: domainOf(
      [...all, ...errors].map((v) => v / factor),
      0.1,
    ),
    range: [FREQUENCY.bottom, FREQUENCY.top],
  };
  const marks = inView.map((p) =>
    markOf(
      {
        x: place(x, p.mjd),
        y: place(y, p.deltaNuHz / factor),
        halfError: halfError(y, p.uncertaintyHz / factor),
        after: p.mjd > picture.epochMjd,
        used: true,
      },
      palette,
      9,
    ),
  );
  return markup`${panelGround(FREQUENCY, y, 'Δν against the spin-down before', unit, palette, 5)}${epochBand(canvas, FREQUENCY)}${fitCurve(
    canvas,
    fit.map((p) => ({ mjd: p.mjd, value: p.value / factor })),
    y,
  )}${inPanel(FREQUENCY, marks)}${axisLine(x, FREQUENCY, palette)}`;
}

function arrivals(
  { picture, view, x, palette }: Canvas,
  box: PanelBox,
  y: Scale,
  value: (p: View['points'][number]) => number | null,
): Markup {
  const radius = view.points.length > 150 ? 6 : 8;
  const marks = view.points.map((p) => {
    const v = value(p);
    if (v === null) return null;
    return markOf(
      {
        x: place(x, p.mjd),
        y: place(y, v),
        halfError: halfError(y, p.uncertaintyTurns),
        after: p.mjd > picture.epochMjd,
        used: p.used,
      },
      palette,
      radius,
    );
  });
  return inPanel(box, marks);
}

function halfError(y: Scale, uncertainty: number): number {
  return Math.abs(place(y, uncertainty) - place(y, 0));
}

/** A nested viewport cuts what leaves the panel. */
function inPanel(box: PanelBox, marks: readonly (Markup | null)[]): Markup {
  const height = px(box.bottom - box.top);
  return markup`<svg aria-hidden="true" x="${LEFT}" y="${px(box.top)}" width="${RIGHT - LEFT}" height="${height}" viewBox="${LEFT} ${px(box.top)} ${RIGHT - LEFT} ${height}">
${marks}</svg>
`;
}

function fitCurve({ x, palette }: Canvas, fit: readonly CurvePoint[], y: Scale): Markup | null {
  return curve(
    fit.map((p) => [place(x, p.mjd), place(y, p.value)]),
    palette.fit,
    4,
  );
}

/** The 68 % interval of the epoch as a band, at least wide enough to see, with the best epoch as a line. */
function epochBand({ picture, x, palette, view }: Canvas, box: PanelBox): Markup {
  const within = (mjd: number) => place(x, Math.min(view.to, Math.max(view.from, mjd)));
  const [low, high] = picture.epochInterval68;
  const width = Math.max(6, within(high) - within(low));
  const middle = (within(high) + within(low)) / 2;
  return markup`<rect x="${px(middle - width / 2)}" y="${px(box.top)}" width="${px(width)}" height="${px(box.bottom - box.top)}" fill="${palette.epoch}" fill-opacity="0.6"/>
<line x1="${px(within(picture.epochMjd))}" y1="${px(box.top)}" x2="${px(within(picture.epochMjd))}" y2="${px(box.bottom)}" stroke="${palette.ink}" stroke-width="2" stroke-dasharray="10 8"/>
`;
}

function axisLine(x: Scale, box: PanelBox, palette: PlotPalette): Markup {
  const ticks = ticksOf(x.domain, 5).values;
  return markup`${line(LEFT, box.bottom, RIGHT, box.bottom, palette.faint, 2.5)}${ticks.map((t) => line(place(x, t), box.bottom, place(x, t), box.bottom + 10, palette.faint, 2.5))}`;
}

/** MJD on every tick, the civil date under as many of them as have room. */
function timeAxis({ x, palette }: Canvas): Markup {
  const { values, decimals } = ticksOf(x.domain, 5);
  const base = FREQUENCY.bottom;
  const spacing = values.length < 2 ? Infinity : place(x, values[1]!) - place(x, values[0]!);
  const stride = Math.max(1, Math.ceil(DATE_WIDTH / spacing));
  const dated = values.filter((_, i) => i % stride === 0);
  return markup`${values.map((t) =>
    words(place(x, t), base + 44, tickLabel(t, decimals), { size: 30, fill: palette.ink, anchor: 'middle' }),
  )}${dated.map((t) =>
    words(place(x, t), base + 80, isoDay(dateOfMjd(t), 'UTC'), { size: 26, fill: palette.faint, anchor: 'middle' }),
  )}${words((LEFT + RIGHT) / 2, base + 132, 'MJD (TDB, at the barycentre) and civil date (UTC)', { size: 28, fill: palette.ink, anchor: 'middle' })}`;
}

const DATE_WIDTH = 185;

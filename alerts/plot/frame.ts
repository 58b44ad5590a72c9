import { type Markup, markup } from '../markup.ts';
import type { PlotPalette } from './palette.ts';
import { place, type Scale, tickLabel, ticksOf } from './scale.ts';

/** What every panel has: ground, grid, axes, words. Sizes are for a picture 1080 px wide that a phone shows at a third. */
export const WIDTH = 1080;
export const LEFT = 148;
export const RIGHT = WIDTH - 148;
const FONT = 'DejaVu Sans';
const TICK_TEXT = 30;
const TITLE_TEXT = 31;

export interface PanelBox {
  readonly top: number;
  readonly bottom: number;
}

/** Two decimals of a pixel: the same bytes on every machine, and no longer than needed. */
export function px(value: number): string {
  return String(Math.round(value * 100) / 100);
}

export function words(
  x: number,
  y: number,
  text: string,
  style: {
    readonly size: number;
    readonly fill: string;
    readonly anchor?: 'start' | 'middle' | 'end';
    readonly bold?: true;
  },
): Markup {
  return markup`<text x="${px(x)}" y="${px(y)}" font-family="${FONT}" font-size="${style.size}" font-weight="${style.bold ? 'bold' : 'normal'}" fill="${style.fill}" text-anchor="${style.anchor ?? 'start'}">${text}</text>\n`;
}

export function line(x1: number, y1: number, x2: number, y2: number, colour: string, thickness: number): Markup {
  return markup`<line x1="${px(x1)}" y1="${px(y1)}" x2="${px(x2)}" y2="${px(y2)}" stroke="${colour}" stroke-width="${thickness}"/>\n`;
}

/** A curve, broken where it leaves `clip`. */
export function curve(
  points: readonly (readonly [number, number])[],
  colour: string,
  thickness: number,
): Markup | null {
  if (points.length < 2) return null;
  const path = points.map(([x, y], i) => `${i === 0 ? 'M' : 'L'}${px(x)} ${px(y)}`).join('');
  return markup`<path d="${path}" fill="none" stroke="${colour}" stroke-width="${thickness}" stroke-linejoin="round" stroke-linecap="round"/>\n`;
}

/** Ground, horizontal grid with labels on the left, and the panel's name above it. */
export function panelGround(
  box: PanelBox,
  y: Scale,
  name: string,
  unit: string,
  palette: PlotPalette,
  ticks: number,
): Markup {
  const { values, decimals } = ticksOf(y.domain, ticks);
  return markup`<rect x="${LEFT}" y="${px(box.top)}" width="${RIGHT - LEFT}" height="${px(box.bottom - box.top)}" fill="${palette.panel}"/>
${values.map((v) => line(LEFT, place(y, v), RIGHT, place(y, v), palette.grid, v === 0 ? 3 : 1.5))}${values.map((v) =>
  words(LEFT - 14, place(y, v) + 11, tickLabel(v, decimals), { size: TICK_TEXT, fill: palette.faint, anchor: 'end' }),
)}${words(LEFT, box.top - 24, name, { size: TITLE_TEXT, fill: palette.ink, bold: true })}${words(LEFT - 14, box.top - 24, unit, { size: TICK_TEXT - 1, fill: palette.faint, anchor: 'end' })}`;
}

/** A second set of labels on the right, for the same panel in another unit. */
export function rightAxis(box: PanelBox, y: Scale, unit: string, palette: PlotPalette, ticks: number): Markup {
  const { values, decimals } = ticksOf(y.domain, ticks);
  return markup`${values.map((v) => [
    line(RIGHT, place(y, v), RIGHT + 8, place(y, v), palette.faint, 2),
    words(RIGHT + 14, place(y, v) + 11, tickLabel(v, decimals), { size: TICK_TEXT, fill: palette.faint }),
  ])}${words(RIGHT + 14, box.top - 24, unit, { size: TICK_TEXT - 1, fill: palette.faint })}`;
}

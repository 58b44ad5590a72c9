import { type Markup, markup } from '../markup.ts';
import { line, px } from './frame.ts';
import type { PlotPalette } from './palette.ts';

/** One arrival: a disc before the event, a diamond after it, hollow where it was set aside. */
export interface Mark {
  readonly x: number;
  readonly y: number;
  readonly halfError: number;
  readonly after: boolean;
  readonly used: boolean;
}

export function markOf(mark: Mark, palette: PlotPalette, radius: number): Markup {
  const colour = mark.used ? (mark.after ? palette.after : palette.before) : palette.faint;
  const fill = mark.used ? colour : palette.panel;
  const bar =
    mark.halfError > radius
      ? line(mark.x, mark.y - mark.halfError, mark.x, mark.y + mark.halfError, colour, 2.5)
      : null;
  return markup`${bar}${mark.after ? diamond(mark, radius * 1.25, fill, colour) : disc(mark, radius, fill, colour)}`;
}

function disc({ x, y }: Mark, radius: number, fill: string, stroke: string): Markup {
  return markup`<circle cx="${px(x)}" cy="${px(y)}" r="${px(radius)}" fill="${fill}" stroke="${stroke}" stroke-width="2.5"/>\n`;
}

function diamond({ x, y }: Mark, r: number, fill: string, stroke: string): Markup {
  const path = `M${px(x)} ${px(y - r)}L${px(x + r)} ${px(y)}L${px(x)} ${px(y + r)}L${px(x - r)} ${px(y)}Z`;
  return markup`<path d="${path}" fill="${fill}" stroke="${stroke}" stroke-width="2.5"/>\n`;
}

import { raw } from 'hono/html';
import { eventSvg, type PlotPalette } from '../../../alerts/index.ts';
import type { EventRecord } from '../../records.ts';
import type { Html } from './layout.ts';
import { sizeText } from './wording.ts';

/** The mail's picture in the page's own colours, which follow daylight, night and paper by themselves. */
const PAGE_PALETTE: PlotPalette = {
  background: 'var(--panel)',
  panel: 'var(--paper)',
  ink: 'var(--ink)',
  faint: 'var(--quiet)',
  grid: 'var(--line)',
  before: 'var(--before)',
  after: 'var(--after)',
  fit: 'var(--ink)',
  epoch: 'var(--epoch)',
};

/** Null: the event has no picture. The drawing escapes its words itself. */
export function eventPlot({ event, picture }: EventRecord, title: string): Html | null {
  return picture === null ? null : raw(eventSvg(picture, { title, subtitle: sizeText(event) }, PAGE_PALETTE));
}

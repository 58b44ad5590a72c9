import { html, raw } from 'hono/html';
import type { EventPicture } from '../../../detectors/steps/pulsarEvent.ts';
import { chartSvg } from '../charts/chart.ts';
import { eventCharts } from '../charts/eventCharts.ts';
import type { Html } from './layout.ts';

/** Named for what they do; shown where scripts run. */
const ACTS = [
  ['in', 'Zoom in', '+'],
  ['out', 'Zoom out', '−'],
  ['earlier', 'Earlier', '←'],
  ['later', 'Later', '→'],
  ['all', 'Show all', 'All'],
] as const;

/** Every panel of an event on one axis of time. The drawings escape their words themselves. */
export function eventPlots(picture: EventPicture): Html {
  const aside = picture.points.filter((point) => !point.used).length;
  return html`<div class="charts">
    <div class="chart-bar" role="group" aria-label="Axis of time" hidden>${ACTS.map(
      ([act, name, sign]) =>
        html`<button type="button" data-act="${act}" aria-label="${name}" title="${name}">${sign}</button>`,
    )}</div>
    ${eventCharts(picture).map(
      (
        chart,
      ) => html`<figure class="plot"><figcaption><strong>${chart.heading}</strong> <span class="quiet">${chart.unit}</span></figcaption>
      ${raw(String(chartSvg(chart)))}
      <output class="readout" aria-live="polite"></output></figure>`,
    )}
    <p class="quiet legend"><span class="key before" aria-hidden="true">●</span> before, <span class="key after" aria-hidden="true">◆</span> after, hollow: set aside (${aside} of ${picture.points.length} arrivals). Band and dashed line: epoch with its 68 % interval. MJD (TDB) at the barycentre.</p>
  </div>`;
}

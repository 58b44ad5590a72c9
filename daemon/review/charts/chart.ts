import { type Markup, markup } from '../../../alerts/markup.ts';
import { domainOf, place, type Scale, tickLabel, ticksOf } from '../../../alerts/plot/scale.ts';
import { dateOfMjd } from '../../../alerts/wording/dates.ts';

/**
 * One panel of an event's picture, drawn for a page: marks with error bars, the fitted curve and the epoch. It is whole as it is; where scripts run,
 * `looks/chartScript.ts` moves the same marks when the reader zooms. What that needs stands beside them as data.
 */
export interface Chart {
  readonly id: string;
  readonly heading: string;
  /** Of `y`, in the panel's unit. */
  readonly unit: string;
  readonly marks: readonly ChartMark[];
  readonly curve: readonly (readonly [mjd: number, y: number])[];
  readonly epoch: readonly [low: number, best: number, high: number];
  readonly domain: readonly [from: number, to: number];
  readonly height: number;
  /** What the panel shows, for who does not see it. */
  readonly summary: string;
}

export interface ChartMark {
  readonly mjd: number;
  readonly y: number;
  readonly error: number;
  readonly kind: 'before' | 'after' | 'aside';
  /** Value with uncertainty in words. */
  readonly says: string;
}

/** The script reads the same numbers from the drawing's attributes. */
const WIDTH = 640;
const MARGIN = { left: 66, right: 12, top: 10, bottom: 40 } as const;
const AIR = 0.08;
const Y_TICKS = 5;
const X_TICKS = 5;

export function chartSvg(chart: Chart): Markup {
  const right = WIDTH - MARGIN.right;
  const bottom = chart.height - MARGIN.bottom;
  const x: Scale = { domain: chart.domain, range: [MARGIN.left, right] };
  const y: Scale = { domain: yDomain(chart), range: [bottom, MARGIN.top] };
  const clip = `${chart.id}-clip`;
  const curve = chart.curve
    .map(([mjd, v], i) => `${i === 0 ? 'M' : 'L'}${px(place(x, mjd))} ${px(place(y, v))}`)
    .join('');
  const data = JSON.stringify({
    margin: MARGIN,
    air: AIR,
    ticks: [X_TICKS, Y_TICKS],
    domain: chart.domain,
    epoch: chart.epoch,
    points: chart.marks.map((m) => [rounded(m.mjd), rounded(m.y), rounded(m.error), m.kind === 'aside' ? 0 : 1]),
    curve: chart.curve.map((p) => p.map(rounded)),
  });
  return markup`<svg class="chart" id="${chart.id}" viewBox="0 0 ${WIDTH} ${chart.height}" role="img" aria-label="${chart.summary}" data-chart="${data}">
<clipPath id="${clip}"><rect class="ground-clip" x="${MARGIN.left}" y="${MARGIN.top}" width="${right - MARGIN.left}" height="${bottom - MARGIN.top}"/></clipPath>
<rect class="ground" x="${MARGIN.left}" y="${MARGIN.top}" width="${right - MARGIN.left}" height="${bottom - MARGIN.top}"/>
<g class="axes" aria-hidden="true">${axes(x, y, bottom, right)}</g>
<g clip-path="url(#${clip})"><rect class="epoch-band" ${band(chart, x)} y="${MARGIN.top}" height="${bottom - MARGIN.top}"/>
<line class="epoch-line" x1="${px(place(x, chart.epoch[1]))}" x2="${px(place(x, chart.epoch[1]))}" y1="${MARGIN.top}" y2="${bottom}"/>
<path class="curve" d="${curve}"/>
${chart.marks.map((m) => mark(m, x, y))}</g>
</svg>`;
}

function mark(m: ChartMark, x: Scale, y: Scale): Markup {
  const half = px(Math.abs(place(y, m.error) - place(y, 0)));
  const shape =
    m.kind === 'after'
      ? markup`<path class="shape" d="M0 -5L5 0L0 5L-5 0Z"/>`
      : markup`<circle class="shape" r="3.8"/>`;
  return markup`<g class="point ${m.kind}" transform="translate(${px(place(x, m.mjd))} ${px(place(y, m.y))})"><title>${m.says}</title><line class="error" y1="-${half}" y2="${half}"/>${shape}</g>
`;
}

/** From what is in use; what was set aside may stand outside. */
function yDomain({ marks, curve }: Chart): readonly [number, number] {
  const used = marks.filter((m) => m.kind !== 'aside').flatMap((m) => [m.y - m.error, m.y + m.error]);
  return domainOf([...used, ...curve.map(([, v]) => v)], AIR);
}

function band({ epoch: [low, best, high] }: Chart, x: Scale): Markup {
  const width = Math.max(2, place(x, high) - place(x, low));
  const middle = low === high ? best : (low + high) / 2;
  return markup`x="${px(place(x, middle) - width / 2)}" width="${px(width)}"`;
}

function axes(x: Scale, y: Scale, bottom: number, right: number): Markup {
  const across = ticksOf(y.domain, Y_TICKS);
  const along = ticksOf(x.domain, X_TICKS);
  return markup`${across.values.map((v) => {
    const at = place(y, v);
    return markup`<line class="grid" x1="${MARGIN.left}" x2="${right}" y1="${px(at)}" y2="${px(at)}"/><text x="${MARGIN.left - 7}" y="${px(at + 4)}" text-anchor="end">${tickLabel(v, across.decimals)}</text>`;
  })}${along.values.map((t) => {
    const at = place(x, t);
    return markup`<line class="tick" x1="${px(at)}" x2="${px(at)}" y1="${bottom}" y2="${bottom + 5}"/><text x="${px(at)}" y="${bottom + 18}" text-anchor="middle">${tickLabel(t, along.decimals)}</text><text class="date" x="${px(at)}" y="${bottom + 33}" text-anchor="middle">${dateOfMjd(t).toISOString().slice(0, 10)}</text>`;
  })}`;
}

function px(value: number): string {
  return String(Math.round(value * 10) / 10);
}

/** More digits than a screen can show, fewer than a double holds. */
function rounded(value: number): number {
  return Number(value.toPrecision(10));
}

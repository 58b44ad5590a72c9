import type { RecentArrivals } from '../../../detectors/report.ts';

/** A pulsar's last arrivals in a picture of a word's size. Numbers alone go into it. */

const WIDTH = 132;
const HEIGHT = 30;
const EDGE = 3;

export function sparkline({ points }: RecentArrivals, label: string): string {
  if (points.length < 2) return '';
  const first = Math.min(-1, ...points.map(([days]) => days));
  // One that was set aside may stand outside: it does not set the scale.
  const used = points.filter(([, , , isUsed]) => isUsed);
  const reach = Math.max(1e-9, ...used.map(([, turns, sigma]) => Math.abs(turns) + sigma));
  const x = (days: number) => px(EDGE + (1 - days / first) * (WIDTH - 2 * EDGE));
  const y = (turns: number) => px(HEIGHT / 2 - Math.max(-1, Math.min(1, turns / reach)) * (HEIGHT / 2 - EDGE));
  const bars = used.map(([days, turns, sigma]) => `M${x(days)} ${y(turns - sigma)}V${y(turns + sigma)}`).join('');
  // A line of no length with round ends is a dot: one path instead of an element an arrival.
  const dots = (isUsed: boolean) =>
    points.map(([days, turns, , own]) => (own === isUsed ? `M${x(days)} ${y(turns)}h0` : '')).join('');
  return `<svg class="spark" viewBox="0 0 ${WIDTH} ${HEIGHT}" width="${WIDTH}" height="${HEIGHT}" role="img" aria-label="${label}"><path class="zero" d="M0 ${HEIGHT / 2}H${WIDTH}"/><path class="error" d="${bars}"/><path class="dots" d="${dots(true)}"/><path class="dots aside" d="${dots(false)}"/></svg>`;
}

function px(value: number): string {
  return String(Math.round(value * 10) / 10);
}

/** The ratio of the delays by history, cadence and size, as an SVG. */
import type { Result } from './detectionTable.ts';
import { CADENCES, EXPECTED } from './detectionTrial.ts';

const WIDTH = 720;
const HEAD = 46;
/** Of one panel, and within it. */
const HEIGHT = 350;
const LEFT = 70;
const BOTTOM = 310;
const TOP = 30;
/** A tenth above the best delay. */
const AIM = 1.1;
const SHADES = ['#1b4f72', '#2e86c1', '#85c1e9'];
const BAR = 34;

export function detectionPicture({ date, seed, histories }: Result): string {
  return `<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 ${WIDTH} ${HEAD + HEIGHT * histories.length}" font-family="sans-serif" font-size="12">
<title>Delay of confirmation over that of the clairvoyant, by history and cadence</title>
<rect width="${WIDTH}" height="${HEAD + HEIGHT * histories.length}" fill="#fff"/>
<text x="${LEFT}" y="20" font-size="15">Delay of confirmation over that of the clairvoyant test (${date}, seed ${seed})</text>
<text x="${LEFT}" y="38">Bars of a group: glitches that the test needs about ${EXPECTED.join(', ')} arrivals for; whiskers: one standard error</text>
${histories.map((h, k) => `<g transform="translate(0 ${HEAD + HEIGHT * k})">\n${panel(h)}\n</g>`).join('\n')}
</svg>
`;
}

function panel({ history, rows }: Result['histories'][number]): string {
  const cells = rows.filter((r) => r.cadence !== null && r.expected !== null && r.trials > 0);
  const highest = Math.max(1.5, ...cells.map((r) => r.confirmed + r.standardError));
  const y = (ratio: number) => BOTTOM - ((BOTTOM - TOP) * ratio) / highest;
  const x = (cadence: string, size: number) =>
    LEFT + 30 + CADENCES.indexOf(cadence) * ((WIDTH - LEFT - 40) / CADENCES.length) + size * (BAR + 4);
  const bars = cells.map((r) => {
    const size = EXPECTED.indexOf(r.expected as (typeof EXPECTED)[number]);
    const left = x(r.cadence!, size);
    const middle = left + BAR / 2;
    const whisker = `M${middle} ${y(r.confirmed - r.standardError)}V${y(r.confirmed + r.standardError)}`;
    return `<rect x="${left}" y="${y(r.confirmed)}" width="${BAR}" height="${BOTTOM - y(r.confirmed)}" fill="${SHADES[size]}"/>
<path d="${whisker}" stroke="#222"/>
<text x="${middle}" y="${BOTTOM - 6}" fill="#fff" text-anchor="middle">${r.confirmed.toFixed(2)}</text>`;
  });
  const ticks = Array.from({ length: Math.floor(highest * 2) + 1 }, (_, k) => k / 2).filter(
    (_, k) => highest < 4 || k % 2 === 0,
  );
  return `<text x="${LEFT}" y="${TOP - 12}">About ${history} arrivals before the glitch</text>
${ticks.map((t) => `<path d="M${LEFT} ${y(t)}H${WIDTH - 10}" stroke="#ddd"/><text x="${LEFT - 8}" y="${y(t) + 4}" text-anchor="end">${t}</text>`).join('\n')}
${bars.join('\n')}
<path d="M${LEFT} ${y(AIM)}H${WIDTH - 10}" stroke="#b03a2e" stroke-dasharray="6 4"/>
<text x="${WIDTH - 10}" y="${y(AIM) - 4}" fill="#b03a2e" text-anchor="end">${AIM.toFixed(2)}</text>
${CADENCES.map((c) => `<text x="${x(c, 1) + BAR / 2}" y="${BOTTOM + 20}" text-anchor="middle">${c}</text>`).join('\n')}`;
}

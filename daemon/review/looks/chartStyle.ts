/** Plots, small pictures and lists: what is drawn rather than set. */
export const CHART_STYLE = `
.chart { display: block; width: 100%; height: auto; touch-action: pan-y; cursor: crosshair; }
.chart .ground { fill: var(--paper); }
.chart .grid { stroke: var(--line); } .chart .tick { stroke: var(--quiet); }
.chart text { fill: var(--quiet); font-size: 12px; font-variant-numeric: tabular-nums; }
.chart .date { font-size: 11px; }
.chart .epoch-band { fill: var(--epoch); fill-opacity: 0.55; } .chart .epoch-line { stroke: var(--ink); stroke-dasharray: 5 4; }
.chart .curve { fill: none; stroke: var(--ink); stroke-width: 1.5; stroke-linejoin: round; }
.point { stroke-width: 1.3; } .point .error { stroke: currentColor; } .point .shape { stroke: currentColor; fill: currentColor; }
.point.before, .key.before { color: var(--before); } .point.after, .key.after { color: var(--after); }
.point.aside { color: var(--quiet); } .point.aside .shape { fill: var(--paper); }
.point.chosen .shape { stroke: var(--ink); stroke-width: 2.5; transform: scale(1.5); }
.plot { margin: 0.6rem 0 0; background: var(--panel); border: 1px solid var(--line); border-radius: 4px; padding: 0.5rem; break-inside: avoid; }
.plot figcaption { padding: 0 0.25rem 0.35rem; }
.readout { display: block; min-height: 1.45em; padding: 0.1rem 0.25rem 0; font-size: 0.93em; }
.chart-bar { display: flex; gap: 0.35rem; margin-top: 0.5rem; }
.chart-bar button { min-width: 2.4rem; }
.legend { margin-top: 0.4rem; }

.spark { display: inline-block; vertical-align: middle; }
.spark path { fill: none; } .spark .dots { stroke: var(--fill); stroke-width: 3; stroke-linecap: round; } .spark .dots.aside { stroke: var(--waiting); }
.spark .error { stroke: var(--fill); stroke-opacity: 0.6; } .spark .zero { stroke: var(--line); }
th a { color: inherit; text-decoration: none; }
th a:hover, th[aria-sort] a { text-decoration: underline; }
th[aria-sort="ascending"] a::after { content: " ↑"; } th[aria-sort="descending"] a::after { content: " ↓"; }
.filter { display: flex; flex-wrap: wrap; gap: 0.5rem 1rem; align-items: center; margin-top: 0.7rem; }
.filter input, .filter select {
  font: inherit; color: var(--ink); background: var(--panel); border: 1px solid var(--quiet); border-radius: 3px; padding: 0.25rem 0.5rem;
}
.tries { margin: 0; padding: 0; list-style: none; }
.why { white-space: normal; }

button { font: inherit; color: var(--ink); background: var(--panel); border: 1px solid var(--quiet); border-radius: 4px; padding: 0.2rem 0.6rem; cursor: pointer; }
[hidden] { display: none !important; }
dialog {
  color: var(--ink); background: var(--panel); border: 1px solid var(--quiet); border-radius: 6px; padding: 1rem 1.3rem; max-width: 34rem;
}
dialog::backdrop { background: rgb(0 0 0 / 0.45); }
dialog h2 { margin: 0 0 0.5rem; }
.key-list { margin: 0 0 0.6rem; } .key-list div { display: flex; gap: 0.8rem; padding: 0.15rem 0; }
.key-list dt { flex: 0 0 5.5rem; } .key-list dd { margin: 0; }
.siblings { display: flex; flex-wrap: wrap; gap: 0.2rem 1.2rem; margin-top: 0.9rem; }
details summary { cursor: pointer; margin-top: 0.5rem; color: var(--link); width: max-content; max-width: 100%; }
@media screen and (max-width: 44rem) { .tools [data-opens] { display: none; } }
@media print {
  .chart-bar, .readout, .siblings, .filter, .tools, dialog { display: none !important; }
  .plot { max-width: 16cm; }
  details:not([open]) summary { list-style: none; color: inherit; }
  .point, .chart .epoch-band, .spark { print-color-adjust: exact; }
}
`;

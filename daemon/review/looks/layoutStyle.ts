/** Calm and dense: one column of sections, tables of tabular figures, no decoration that carries no meaning. */
export const LAYOUT_STYLE = `
*, *::before, *::after { box-sizing: border-box; }
html { -webkit-text-size-adjust: 100%; }
body {
  margin: 0; background: var(--paper); color: var(--ink);
  font: 0.9375rem/1.45 system-ui, "Segoe UI", "DejaVu Sans", sans-serif; font-variant-numeric: tabular-nums;
}
main { max-width: 78rem; margin: 0 auto; padding: 0 1.25rem 1.5rem; }
h1, h2, h3 { line-height: 1.2; font-weight: 650; margin: 0; }
h1 { font-size: 1.45rem; }
main > h1 { margin-top: 1.4rem; }
h2 { font-size: 1.02rem; margin-top: 1.75rem; }
h3 { font-size: 0.95rem; }
p { margin: 0.35rem 0; }
a { color: var(--link); text-underline-offset: 0.15em; }
small, .quiet, .lead, .asof, .foot { color: var(--quiet); font-size: 0.93em; }
.unseen { position: absolute; width: 1px; height: 1px; overflow: hidden; clip-path: inset(50%); white-space: nowrap; }
:focus-visible { outline: 2px solid var(--focus); outline-offset: 2px; border-radius: 2px; }
.skip { position: absolute; left: -999rem; }
.skip:focus { left: 1rem; top: 0.5rem; background: var(--panel); padding: 0.4rem 0.8rem; }

.top {
  display: flex; flex-wrap: wrap; gap: 0.25rem 1.5rem; align-items: baseline;
  padding: 0.6rem 1.25rem; border-bottom: 1px solid var(--line); background: var(--panel);
}
.top p { margin: 0; }
.tools { display: flex; gap: 0.35rem; }
.observatory { font-weight: 650; }
.top nav { display: flex; gap: 0.15rem; flex: 1; }
.top nav a { padding: 0.2rem 0.7rem; border-radius: 4px; text-decoration: none; color: var(--ink); }
.top nav a:hover { background: var(--track); }
.top nav a[aria-current] { background: var(--track); font-weight: 650; }
.live { margin: 0; }
.live:not(:empty) { padding: 0.5rem 1.25rem; background: var(--panel); border-bottom: 1px solid var(--line); }
.live[data-kind="lost"] { color: var(--rejected); font-weight: 650; }
.live[data-kind="changed"] { color: var(--waiting); }
.alarm { border-bottom: 2px solid var(--rejected); background: var(--panel); padding: 0.6rem 1.25rem; }
.alarm strong { color: var(--rejected); }
.alarm ul, .caution ul { margin: 0.1rem 0; padding: 0; list-style: none; }
.caution { border-left: 3px solid var(--waiting); background: var(--panel); padding: 0.45rem 0.8rem; margin: 0.9rem 0 0; }
.foot { max-width: 78rem; margin: 0 auto; padding: 0.75rem 1.25rem 2rem; border-top: 1px solid var(--line); }
kbd { font: inherit; border: 1px solid var(--line); border-radius: 3px; padding: 0 0.3em; background: var(--panel); }
.plain { max-width: 36rem; padding-top: 3rem; }

.glance { display: grid; grid-template-columns: repeat(auto-fit, minmax(15rem, 1fr)); gap: 0.6rem; margin-top: 1rem; }
.tile {
  display: flex; flex-direction: column; gap: 0.05rem; padding: 0.55rem 0.75rem; text-decoration: none; color: var(--ink);
  background: var(--panel); border: 1px solid var(--line); border-left-width: 3px; border-radius: 4px;
}
.tile:hover { border-color: var(--link); }
.tile .label, .tile .detail { color: var(--quiet); font-size: 0.85rem; overflow-wrap: anywhere; }
.tile .value { font-size: 1.2rem; font-weight: 650; }
.tile.attention { border-left-color: var(--waiting); }
.tile.attention .value, .attention { color: var(--waiting); }

table { width: 100%; border-collapse: collapse; margin-top: 0.5rem; background: var(--panel); border: 1px solid var(--line); }
th, td { text-align: left; vertical-align: baseline; padding: 0.35rem 0.7rem; border-bottom: 1px solid var(--line); }
tbody tr:last-child td { border-bottom: 0; }
tbody tr:hover { background: var(--paper); }
th { color: var(--quiet); font-weight: 600; font-size: 0.85rem; vertical-align: bottom; }
.number { text-align: right; }
td.number { white-space: nowrap; }
td small, td.whole { white-space: nowrap; }
.path, .note, td bdi { overflow-wrap: anywhere; }
.path { display: inline-block; min-width: 7.5rem; }
.note { white-space: pre-wrap; }
td .note { display: -webkit-box; -webkit-box-orient: vertical; -webkit-line-clamp: 3; overflow: hidden; min-width: 7rem; }
.empty { color: var(--quiet); padding: 0.45rem 0; }
a.event { font-weight: 600; text-decoration: none; white-space: nowrap; }
a.event bdi { text-decoration: underline; overflow-wrap: normal; }
.mark { display: inline-block; width: 1.1em; margin-right: 0.3em; text-align: center; }
.suspected { color: var(--suspected); } .confirmed { color: var(--waiting); } .withdrawn { color: var(--quiet); }
.accepted { color: var(--accepted); } .rejected { color: var(--rejected); }

.subject { display: flex; flex-wrap: wrap; justify-content: space-between; align-items: baseline; gap: 0.3rem 1.5rem; margin-top: 1.4rem; }
.state { font-weight: 650; margin: 0; }
.spread { display: grid; grid-template-columns: minmax(0, 1fr) 21rem; gap: 0 1.75rem; align-items: start; }
.judgement { position: sticky; top: 0.75rem; }
.numbers { display: grid; grid-template-columns: repeat(auto-fill, minmax(19rem, 1fr)); gap: 0 1.5rem; margin: 0.5rem 0 0; }
.numbers div { display: flex; justify-content: space-between; gap: 1rem; padding: 0.28rem 0; border-bottom: 1px solid var(--line); }
.numbers dt { color: var(--quiet); flex: none; max-width: 50%; }
.numbers dd { margin: 0; text-align: right; }
.bars { list-style: none; padding: 0; margin: 0.5rem 0 0; display: grid; gap: 0.3rem; }
.bars li { display: grid; grid-template-columns: 9.5rem 1fr 4rem; gap: 0.6rem; align-items: center; }
.bar { width: 100%; height: 0.6rem; } .bar .track { fill: var(--track); } .bar .fill { fill: var(--fill); }
.how { text-align: right; }
.todo { margin: 0.4rem 0 0; padding-left: 1.1rem; }
.todo li { margin: 0.25rem 0; }
.inline { list-style: none; padding: 0; margin: 0.4rem 0 0; display: flex; flex-wrap: wrap; gap: 0.3rem 1.2rem; }

.verdict { background: var(--panel); border: 1px solid var(--line); border-radius: 4px; padding: 0.8rem 1rem 0.9rem; margin-top: 1.75rem; }
.verdict h2 { margin: 0 0 0.4rem; }
.verdict fieldset { border: 0; padding: 0; margin: 0; }
.verdict label { display: block; margin-top: 0.55rem; }
.verdict .choice { display: flex; gap: 0.5rem; align-items: baseline; margin-top: 0.25rem; }
.verdict input[type="radio"] { accent-color: var(--link); }
.verdict input:not([type="radio"]), .verdict select, .verdict textarea {
  width: 100%; font: inherit; color: var(--ink); background: var(--paper); border: 1px solid var(--quiet); border-radius: 3px; padding: 0.35rem 0.5rem;
}
.verdict textarea { resize: vertical; }
.verdict button {
  font: inherit; font-weight: 650; margin-top: 0.75rem; padding: 0.45rem 1rem; border-radius: 4px; border: 1px solid var(--link);
  background: var(--link); color: var(--panel); cursor: pointer;
}
.refused { color: var(--rejected); font-weight: 600; }
.conflict { border: 1px solid var(--waiting); border-radius: 4px; background: var(--panel); padding: 0.8rem 1rem; margin-top: 1rem; }
.conflict h2 { margin: 0; color: var(--waiting); }
.two { display: grid; grid-template-columns: repeat(auto-fit, minmax(18rem, 1fr)); gap: 0.5rem 2rem; margin-top: 0.6rem; }
.two .numbers { grid-template-columns: 1fr; }
.verdicts { list-style: none; margin: 0.4rem 0 0; padding: 0; }
.verdicts li { border-left: 3px solid var(--line); padding: 0.1rem 0.8rem; margin-top: 0.5rem; }
blockquote { margin: 0.2rem 0; }

@media (max-width: 60rem) { .spread { grid-template-columns: minmax(0, 1fr); } .judgement { position: static; } }
@media screen and (max-width: 44rem) {
  main, .top, .foot { padding-left: 0.85rem; padding-right: 0.85rem; }
  .top nav { order: 3; flex-basis: 100%; margin-left: -0.4rem; }
  .glance { grid-template-columns: 1fr 1fr; }
  .numbers { grid-template-columns: 1fr; }
  .hint { display: none; }
  table, tbody, tr, td { display: block; }
  thead { display: none; }
  table { border: 0; background: none; }
  tr { background: var(--panel); border: 1px solid var(--line); border-radius: 4px; padding: 0.35rem 0.7rem; margin-top: 0.5rem; }
  td, td.number { display: flex; justify-content: space-between; gap: 1rem; text-align: right; white-space: normal; border: 0; padding: 0.15rem 0; }
  td small, td.whole, a.event { white-space: normal; }
  td > div { min-width: 0; }
  td .note { min-width: 0; }
  td::before { content: attr(data-head); color: var(--quiet); font-size: 0.85rem; text-align: left; flex: none; max-width: 50%; }
}
@media (prefers-reduced-motion: no-preference) { a, .tile { transition: border-color 0.1s, background-color 0.1s; } }
@media print {
  :root { --paper: #fff; --panel: #fff; }
  html { font-size: 9.5pt; }
  th, td { padding: 0.25rem 0.45rem; }
  td.whole, td small { white-space: normal; }
  td .note { min-width: 5.5rem; }
  .bars { max-width: 13cm; }
  .numbers { grid-template-columns: 1fr 1fr; }
  nav, .skip, .live, .verdict, .downloads, .hint { display: none !important; }
  main, .top, .foot { max-width: none; padding-left: 0; padding-right: 0; }
  a { color: inherit; text-decoration: none; }
  .spread { display: block; }
  .judgement { position: static; }
  h2 { break-after: avoid; } tr, figure, .tile, .verdicts li { break-inside: avoid; }
  .bar .fill, .bar .track { print-color-adjust: exact; }
}
`;

/** One style for both colour schemes and for paper. Colours are those of Okabe and Ito (Color Universal Design, 2008), lighter
 *  ones in the dark; each also has a shape or a pattern of its own, so that none carries meaning alone. */
export const reportStyle = `
:root {
  color-scheme: light dark;
  --paper: #fbfaf5; --ink: #1c2630; --quiet: #55606b; --line: #d8d4c7; --band: #ece8da;
  --routed: #0072b2; --held: #d55e00; --guarded: #007a59; --mark: #1c2630;
}
@media (prefers-color-scheme: dark) {
  :root {
    --paper: #141a20; --ink: #ece9e0; --quiet: #a9b1b8; --line: #3a444d; --band: #2a333b;
    --routed: #56b4e9; --held: #f0a146; --guarded: #35c79a; --mark: #ece9e0;
  }
}
* { box-sizing: border-box; }
body {
  margin: 0; padding: 1.5rem 1rem 4rem; background: var(--paper); color: var(--ink);
  font: 1rem/1.5 "Segoe UI", "Noto Sans", "DejaVu Sans", Helvetica, Arial, sans-serif;
}
main, header, footer { max-width: 66rem; margin: 0 auto; }
h1, h2, .answer { font-family: Georgia, "Noto Serif", "DejaVu Serif", serif; font-weight: normal; line-height: 1.25; }
h1 { font-size: 1.9rem; margin: 0 0 .25rem; }
h2 { font-size: 1.35rem; margin: 0 0 .5rem; }
h3 { font-size: 1rem; margin: 1.25rem 0 .25rem; }
p { margin: 0 0 .75rem; }
a { color: inherit; }
a:focus-visible, summary:focus-visible, [tabindex]:focus-visible { outline: 3px solid var(--routed); outline-offset: 2px; }
code { font-size: .92em; background: var(--band); padding: .1em .3em; overflow-wrap: anywhere; }
.quiet { color: var(--quiet); }
.tally { display: block; width: 44px; height: 30px; margin-bottom: .75rem; stroke: var(--ink); stroke-width: 3; stroke-linecap: round; }
.answer { font-size: 1.2rem; margin: 0 0 .6rem; }
.first { border-top: 3px double var(--ink); border-bottom: 1px solid var(--line); padding: 1.25rem 0; margin-top: 1rem; display: grid; gap: 1rem 3rem; }
.first ol { margin: .25rem 0 0; padding-left: 1.3rem; }
.first li { margin-bottom: .5rem; }
section.view { border-bottom: 1px solid var(--line); padding: 1.75rem 0; display: grid; gap: 0 3rem; }
section.view > * { min-width: 0; }
@media (min-width: 60rem) {
  .first { grid-template-columns: 3fr 2fr; }
  section.view { grid-template-columns: 20rem 1fr; }
}
figure { margin: .25rem 0 .75rem; }
figcaption { color: var(--quiet); font-size: .9rem; margin-top: .4rem; }
.plot { padding: .5rem 1rem 1.6rem 2.9rem; }
.plot svg.area { display: block; width: 100%; height: 15rem; overflow: visible; }
.plot svg.low { height: 7rem; }
svg text { fill: var(--ink); font-size: .8rem; font-family: inherit; }
svg text.dim { fill: var(--quiet); }
.grid { stroke: var(--line); stroke-width: 1; }
.axis { stroke: var(--quiet); stroke-width: 1; }
.curve { fill: none; stroke: var(--routed); stroke-width: 2.5; vector-effect: non-scaling-stroke; }
.dot { fill: var(--routed); stroke: var(--paper); stroke-width: 2; }
.diamond { fill: var(--held); stroke: var(--paper); stroke-width: 1.5; }
.f-routed { fill: var(--routed); } .f-guarded { fill: var(--guarded); } .f-held { fill: url(#held); } .f-held-solid { fill: var(--held); }
.s-held { stroke: var(--held); }
.edge { fill: none; stroke: var(--held); stroke-width: 1.5; }
table { border-collapse: collapse; width: 100%; font-variant-numeric: tabular-nums; }
caption { text-align: left; color: var(--quiet); font-size: .9rem; padding-bottom: .35rem; }
th, td { text-align: left; vertical-align: top; padding: .3rem .75rem .3rem 0; border-top: 1px solid var(--line); overflow-wrap: break-word; }
th { font-weight: 600; font-size: .9rem; }
td.n, th.n { text-align: right; }
td.n { white-space: nowrap; }
td.pic { width: 45%; padding-right: 1rem; }
td.pic svg { display: block; width: 100%; height: 1.5rem; overflow: visible; }
th.name { white-space: nowrap; }
.said { fill: var(--band); stroke: var(--quiet); stroke-width: 1; }
.whisker { stroke: var(--routed); stroke-width: 2; }
.broken .whisker { stroke: var(--held); } .broken .dot { fill: var(--held); }
.bars { list-style: none; margin: 0 0 .75rem; padding: 0; }
.bars li { margin-bottom: .6rem; }
.bars svg { display: block; width: 100%; height: .9rem; margin-top: .15rem; }
.bars .number { float: right; font-variant-numeric: tabular-nums; padding-left: 1rem; }
.key { display: flex; flex-wrap: wrap; gap: .25rem 1.25rem; list-style: none; margin: 0 0 .25rem; padding: 0; font-size: .9rem; }
.key svg { width: 1rem; height: .8rem; margin-right: .35rem; vertical-align: -1px; }
.words { font-style: italic; }
.sound { border-left: 4px solid var(--guarded); padding-left: .75rem; }
.unsound { border-left: 4px solid var(--held); padding-left: .75rem; }
details { margin: .5rem 0; }
summary { cursor: pointer; color: var(--quiet); padding: .25rem 0; }
.wide { overflow-x: auto; } .wide table { min-width: 38rem; }
dl { display: grid; grid-template-columns: max-content 1fr; gap: .2rem 1rem; margin: 0 0 .75rem; }
dt { color: var(--quiet); } dd { margin: 0; }
@media (max-width: 30rem) { dl { grid-template-columns: 1fr; gap: 0; } dd { margin-bottom: .5rem; } td.pic { width: 30%; padding-right: .75rem; } th, td { padding-right: .5rem; } }
@media print {
  :root { --paper: #fff; --ink: #000; --quiet: #444; --line: #bbb; --band: #eee; --routed: #0072b2; --held: #d55e00; --guarded: #007a59; }
  body { padding: 0; font-size: 10pt; }
  section.view, .first { break-inside: avoid; }
}
`;

/** The look of the page for held messages. Two queues compete for a message: the first is a solid line, its rival a dashed one,
 *  in the text, in the balance and in the choices, so that colour alone carries nothing. Okabe and Ito's colours. */
export const settleStyle = `
:root {
  color-scheme: light dark;
  --paper: #fbfaf5; --sheet: #fffefb; --ink: #1c2630; --quiet: #55606b; --line: #d8d4c7; --band: #ece8da;
  --one: #0068a3; --two: #b94f00; --one-wash: #dcecf5; --two-wash: #fbe6d5;
}
@media (prefers-color-scheme: dark) {
  :root {
    --paper: #141a20; --sheet: #1a2128; --ink: #ece9e0; --quiet: #a9b1b8; --line: #3a444d; --band: #2a333b;
    --one: #6cc0f0; --two: #f3a95a; --one-wash: #173447; --two-wash: #43301c;
  }
}
* { box-sizing: border-box; }
body {
  margin: 0; padding: 1rem 1rem 4rem; background: var(--paper); color: var(--ink);
  font: 1rem/1.5 "Segoe UI", "Noto Sans", "DejaVu Sans", Helvetica, Arial, sans-serif;
}
header, main { max-width: 72rem; margin: 0 auto; }
header { display: flex; flex-wrap: wrap; gap: .25rem 1.5rem; align-items: baseline; border-bottom: 3px double var(--ink); padding-bottom: .5rem; margin-bottom: 1rem; }
header p { margin: 0; }
.push { margin-left: auto; }
h1, h2 { font-family: Georgia, "Noto Serif", "DejaVu Serif", serif; font-weight: normal; line-height: 1.25; }
h1 { font-size: 1.5rem; margin: 0 0 .25rem; overflow-wrap: anywhere; }
h2 { font-size: 1.1rem; margin: 1.25rem 0 .35rem; }
p { margin: 0 0 .75rem; }
a { color: inherit; }
.quiet { color: var(--quiet); }
:focus-visible { outline: 3px solid var(--one); outline-offset: 2px; }
.skip { position: absolute; left: -100vw; }
.skip:focus { left: 1rem; top: .5rem; background: var(--paper); padding: .5rem; z-index: 1; }
.waiting { list-style: none; margin: 0; padding: 0; }
.waiting li { border-top: 1px solid var(--line); }
.waiting a { display: grid; grid-template-columns: 1fr; gap: 0 1.5rem; padding: .6rem .25rem; text-decoration: none; }
.waiting a:hover { background: var(--band); }
.waiting .subject { font-weight: 600; overflow-wrap: anywhere; }
@media (min-width: 50rem) { .waiting a { grid-template-columns: 7rem 1fr 1fr; } }
.last { display: flex; flex-wrap: wrap; gap: .5rem 1rem; align-items: center; background: var(--band); padding: .6rem .9rem; margin-bottom: 1rem; }
.last p { margin: 0; flex: 1 1 18rem; }
.bench { display: grid; gap: 1rem 2.5rem; }
.bench > * { min-width: 0; }
@media (min-width: 62rem) { .bench { grid-template-columns: 1fr 22rem; } }
.sheet { background: var(--sheet); border: 1px solid var(--line); padding: 1rem 1.1rem; white-space: pre-wrap; overflow-wrap: anywhere; unicode-bidi: isolate; max-height: none; }
.facts { display: grid; grid-template-columns: max-content 1fr; gap: 0 1rem; margin: 0 0 .75rem; }
.facts dt { color: var(--quiet); } .facts dd { margin: 0; overflow-wrap: anywhere; unicode-bidi: isolate; }
mark { background: none; color: inherit; padding-bottom: 1px; }
mark.one { border-bottom: 2px solid var(--one); } mark.two { border-bottom: 2px dashed var(--two); }
mark.w2 { border-bottom-width: 3px; } mark.w3 { border-bottom-width: 4px; }
mark.one.w3, mark.one.w2 { background: var(--one-wash); } mark.two.w3, mark.two.w2 { background: var(--two-wash); }
.hidden-mark { font-size: .8em; border: 1px solid var(--quiet); color: var(--quiet); padding: 0 .25em; margin: 0 .1em; white-space: nowrap; unicode-bidi: isolate; }
.choices { list-style: none; margin: 0; padding: 0; }
.choices li { margin-bottom: .4rem; }
button { font: inherit; color: inherit; background: var(--sheet); border: 1px solid var(--quiet); border-radius: 2px; padding: .45rem .7rem; cursor: pointer; min-height: 2.75rem; }
button:hover { background: var(--band); }
.choices button { display: grid; grid-template-columns: 1.6rem 1fr auto; gap: 0 .5rem; width: 100%; text-align: left; align-items: center; }
.choices svg { grid-column: 2 / -1; display: block; width: 100%; height: 5px; }
.choices li:nth-child(1) button { border-left: 5px solid var(--one); } .choices li:nth-child(2) button { border-left: 5px dashed var(--two); }
.few { font-variant-numeric: tabular-nums; }
kbd { font: .85em ui-monospace, "DejaVu Sans Mono", monospace; border: 1px solid var(--quiet); border-radius: 3px; padding: 0 .35em; }
.bar { fill: var(--quiet); } li:nth-child(1) .bar { fill: var(--one); } li:nth-child(2) .bar { fill: var(--two); }
table.balance { border-collapse: collapse; width: 100%; font-size: .92rem; font-variant-numeric: tabular-nums; }
.balance th, .balance td { padding: .15rem 0; text-align: left; font-weight: normal; vertical-align: middle; overflow-wrap: anywhere; }
.balance tr.sum th, .balance tr.sum td { border-top: 1px solid var(--line); font-weight: 600; padding-top: .4rem; }
.balance td.pic { width: 34%; padding: 0 .5rem; } .balance td.n { text-align: right; white-space: nowrap; width: 3.2rem; overflow-wrap: normal; }
.balance svg { display: block; width: 100%; height: .8rem; overflow: visible; }
.balance .f-one { fill: var(--one); } .balance .f-two { fill: none; stroke: var(--two); stroke-width: 1.5; stroke-dasharray: 4 2; }
.balance .axis { stroke: var(--quiet); }
caption { text-align: left; color: var(--quiet); padding-bottom: .35rem; }
.unseen { position: absolute; clip-path: inset(50%); width: 1px; height: 1px; overflow: hidden; }
.legend { font-size: .92rem; }
details { margin: .75rem 0; } summary { cursor: pointer; padding: .35rem 0; }
.door { max-width: 30rem; }
@media print { button, .last, .push { display: none; } }
`;

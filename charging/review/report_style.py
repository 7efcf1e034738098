"""Style sheet of the report: screen, phone, A4 paper."""

STYLE = """
:root { --ink: #1b1f24; --quiet: #4d565f; --line: #c9d0d6; --wash: #f3f5f7;
  --bad: #8a1c1c; --badwash: #fbe9e7; --good: #12523d; --goodwash: #e5f2ec;
  --open: #5c4300; --openwash: #fdf3d8; --link: #1f4e8c; }
* { box-sizing: border-box; }
html { font: 16px/1.5 system-ui, "DejaVu Sans", Arial, sans-serif; color: var(--ink);
  background: #fff; }
body { margin: 0; }
.skip { position: absolute; left: -99em; }
.skip:focus { left: 1rem; top: 1rem; background: #fff; padding: .5rem 1rem; z-index: 2;
  border: 2px solid var(--link); }
header, main, footer, nav { max-width: 72rem; margin: 0 auto; padding: 0 1.25rem; }
header { padding-top: 1.5rem; }
h1 { font-size: 1.7rem; line-height: 1.2; margin: 0 0 .25rem; overflow-wrap: anywhere; }
h2 { font-size: 1.25rem; margin: 2.2rem 0 .6rem; padding-top: .4rem;
  border-top: 2px solid var(--ink); }
h3 { font-size: 1.05rem; margin: 1.4rem 0 .4rem; }
p, li { max-width: 60rem; overflow-wrap: anywhere; }
a { color: var(--link); }
a:focus-visible, [tabindex]:focus-visible { outline: 3px solid var(--link); outline-offset: 2px; }
.quiet { color: var(--quiet); }
.verdict { border: 2px solid; border-left-width: .8rem; padding: .7rem 1rem; margin: 1rem 0;
  font-size: 1.15rem; }
.within { color: var(--good); background: var(--goodwash); }
.exceeded { color: var(--bad); background: var(--badwash); }
.not-assessable { color: var(--open); background: var(--openwash); }
.badge { white-space: nowrap; padding: .05rem .4rem; border: 1px solid; border-radius: .2rem;
  font-weight: 600; }
nav ol { columns: 3 16rem; padding-left: 1.4rem; margin: .4rem 0; }
.scroll { overflow-x: auto; margin: .8rem 0; max-width: 100%; }
table { border-collapse: collapse; font-size: .85rem; line-height: 1.35; min-width: 100%; }
caption { text-align: left; font-weight: 600; padding: .3rem 0; }
th, td { text-align: left; vertical-align: top; padding: .3rem .5rem;
  border-bottom: 1px solid var(--line); overflow-wrap: break-word; min-width: 4.2rem; }
.wide7 td:nth-child(8) { min-width: 18rem; }
thead th { border-bottom: 2px solid var(--ink); background: var(--wash);
  overflow-wrap: normal; }
th[scope=row] { font-weight: 600; min-width: 7rem; }
.number { text-align: right; font-variant-numeric: tabular-nums; white-space: nowrap; }
td.long, .long td:last-child { min-width: 16rem; }
.hash { font-family: "DejaVu Sans Mono", monospace; font-size: .8rem; overflow-wrap: anywhere; }
figure { margin: 1rem 0; }
figure svg { width: 100%; height: auto; max-width: 60rem; display: block; }
figcaption { font-size: .85rem; color: var(--quiet); max-width: 60rem; }
footer { padding-bottom: 2rem; border-top: 1px solid var(--line); margin-top: 2.5rem;
  color: var(--quiet); font-size: .85rem; }
@media (max-width: 40rem) {
  html { font-size: 15px; }
  header, main, footer, nav { padding: 0 .8rem; }
  h1 { font-size: 1.35rem; }
  .figurebox { overflow-x: auto; }
  .figurebox svg { min-width: 38rem; }
}
@media print {
  html { font-size: 9.5pt; }
  header, main, footer, nav { max-width: none; padding: 0; }
  .skip { display: none; }
  .scroll { overflow: visible; }
  table { font-size: 7.4pt; }
  th, td { padding: .15rem .3rem; min-width: 0; overflow-wrap: break-word; }
  .wide7 td:nth-child(8) { min-width: 14rem; }
  th[scope=row] { min-width: 0; }
  .number { white-space: normal; }
  td.long, .long td:last-child { min-width: 0; }
  thead { display: table-header-group; }
  tr, figure, .verdict { break-inside: avoid; }
  figure svg { max-height: 215mm; }
  h2, h3, caption { break-after: avoid; }
  a { color: inherit; text-decoration: none; }
  * { print-color-adjust: exact; -webkit-print-color-adjust: exact; }
}
"""

PAGE = """
@page { size: A4; margin: 16mm 13mm 18mm;
  @bottom-left { content: "halflit review, run %(hash)s"; font: 7.5pt sans-serif;
    color: #4d565f; }
  @bottom-center { content: "an estimate; standards and specialists decide";
    font: 7.5pt sans-serif; color: #4d565f; }
  @bottom-right { content: "page " counter(page) " of " counter(pages); font: 7.5pt sans-serif;
    color: #4d565f; } }
"""

"""How a report in HTML looks: system fonts, two palettes, one column, paper."""

STYLE = """\
:root {
  --paper: #fcfbf8; --ink: #1d2430; --soft: #566070; --line: #cfd3da; --shade: #f0eee8;
  --main: #0b5c7a; --other: #a3480c; --mark: #fff3cf;
}
@media (prefers-color-scheme: dark) {
  :root {
    --paper: #15181d; --ink: #e4e7ec; --soft: #a5adba; --line: #3c434e; --shade: #1f242b;
    --main: #6cc4e6; --other: #f0a470; --mark: #3a3214;
  }
}
* { box-sizing: border-box; }
body {
  margin: 0 auto; padding: 1.5rem 1rem 4rem; max-width: 70rem; background: var(--paper);
  color: var(--ink); font: 1rem/1.55 system-ui, "Segoe UI", "Liberation Sans", sans-serif;
  overflow-wrap: anywhere;
}
.skip { position: absolute; left: -100rem; }
.skip:focus { position: static; }
h1 { font-size: 1.7rem; line-height: 1.25; margin: 0 0 .3rem; }
h2 { font-size: 1.25rem; margin: 2.4rem 0 .6rem; border-bottom: 2px solid var(--line);
  padding-bottom: .2rem; }
h3 { font-size: 1.05rem; margin: 1.6rem 0 .4rem; }
header p { color: var(--soft); margin: .2rem 0 .8rem; }
nav ul { list-style: none; display: flex; flex-wrap: wrap; gap: .3rem 1.1rem; padding: 0;
  margin: 0; }
a { color: var(--main); }
p { max-width: 46rem; margin: .5rem 0; }
p.strong { border-left: 4px solid var(--other); padding: .4rem .8rem; background: var(--shade); }
ul { max-width: 46rem; padding-left: 1.3rem; }
dl { margin: .6rem 0; }
dl div { display: flex; flex-wrap: wrap; gap: 0 1rem; padding: .15rem 0;
  border-bottom: 1px solid var(--line); }
dt { flex: 0 0 11rem; color: var(--soft); }
dd { flex: 1 1 20rem; margin: 0; }
.wide { overflow-x: auto; margin: .8rem 0 1.2rem; }
.wide:focus-visible, pre:focus-visible { outline: 2px solid var(--main); }
table { border-collapse: collapse; font-size: .92rem; font-variant-numeric: tabular-nums; }
caption { text-align: left; color: var(--soft); padding-bottom: .35rem; }
th, td { text-align: left; padding: .22rem .7rem .22rem 0; vertical-align: top;
  border-bottom: 1px solid var(--line); overflow-wrap: normal; }
thead th { border-bottom: 2px solid var(--line); color: var(--soft); font-weight: 600; }
tbody th { font-weight: 600; overflow-wrap: break-word; max-width: 22rem; }
td { max-width: 30rem; overflow-wrap: break-word; min-width: 2rem; }
.number { text-align: right; }
thead th { vertical-align: bottom; }
tbody .number, tbody .brief { white-space: nowrap; }
tbody th:not(.brief), tbody td:not(.brief):not(.number) { min-width: 14rem; }
tr.marked > * { background: var(--mark); }
pre { background: var(--shade); padding: .7rem .9rem; overflow-x: auto; font-size: .9rem; }
pre code { white-space: pre-wrap; overflow-wrap: anywhere; }
figure { margin: 1rem 0 1.4rem; }
figure svg { width: 100%; height: auto; display: block; }
figcaption { color: var(--soft); font-size: .92rem; max-width: 46rem; }
svg text { fill: var(--ink); font: 12px system-ui, "Liberation Sans", sans-serif; }
svg .soft { fill: var(--soft); }
svg .grid { stroke: var(--line); stroke-width: 1; fill: none; }
svg .main { stroke: var(--main); stroke-width: 2; fill: none; }
svg .other { stroke: var(--other); stroke-width: 2; fill: none; stroke-dasharray: 7 4; }
svg .limit { stroke: var(--ink); stroke-width: 1; fill: none; stroke-dasharray: 2 4; }
svg .dot { fill: var(--main); }
svg .ring { fill: var(--paper); stroke: var(--other); stroke-width: 2; }
@media print {
  :root { --paper: #fff; --ink: #000; --soft: #444; --line: #bbb; --shade: #f4f4f4;
    --main: #044; --other: #722; --mark: #f2f2f2; }
  body { max-width: none; padding: 0; font-size: 10pt; }
  nav, .skip { display: none; }
  h2, h3, caption { break-after: avoid; }
  tr, figure, dl div { break-inside: avoid; }
  .wide { overflow: visible; }
}
"""

"""The look of the page, on the screen and in print."""

from __future__ import annotations

from typing import Final

__all__ = ["STYLE"]

STYLE: Final = """
:root { color-scheme: light; }
* { box-sizing: border-box; }
body { margin: 0 auto; padding: 1.5rem 1.25rem 3rem; max-width: 66rem; background: #fff; color: #1b1b1b;
  font: 15px/1.5 "DejaVu Sans", Verdana, system-ui, sans-serif; }
h1 { font-size: 1.5rem; line-height: 1.25; margin: 0 0 .3rem; overflow-wrap: anywhere; }
h2 { font-size: 1.12rem; margin: 2.2rem 0 .6rem; padding-top: .5rem; border-top: 2px solid #0072b2; }
h3 { font-size: 1rem; margin: 1.4rem 0 .4rem; overflow-wrap: anywhere; }
p, ul { margin: .4rem 0; }
.lead { color: #444; overflow-wrap: anywhere; }
.path { font-family: "DejaVu Sans Mono", monospace; font-size: .86rem; overflow-wrap: anywhere; }
.facts { display: grid; grid-template-columns: repeat(auto-fit, minmax(21rem, 1fr)); gap: .6rem; margin: 1rem 0; }
.facts div { border: 1px solid #d5d5d5; border-radius: 4px; padding: .5rem .7rem; }
.facts b { display: block; font-size: 1rem; font-variant-numeric: tabular-nums; overflow-wrap: anywhere; }
.facts span { color: #555; font-size: .82rem; }
.wide { overflow-x: auto; }
table { border-collapse: collapse; font-size: .82rem; width: 100%; margin: .5rem 0; }
caption { text-align: left; color: #444; padding: .2rem 0 .4rem; }
th { text-align: left; border-bottom: 1.5px solid #333; font-weight: 600; vertical-align: bottom; }
th, td { padding: .22rem .7rem .22rem 0; }
td { border-bottom: 1px solid #e4e4e4; vertical-align: top; overflow-wrap: break-word; }
tfoot td { border-bottom: 0; font-weight: 600; }
tfoot tr:first-child td { border-top: 1.5px solid #333; }
.number { text-align: right; font-family: "DejaVu Sans Mono", monospace; font-variant-numeric: tabular-nums;
  white-space: nowrap; }
th.number { font-family: inherit; }
.hash { font-family: "DejaVu Sans Mono", monospace; font-size: .74rem; overflow-wrap: anywhere; }
ul.notes li { margin: .2rem 0; }
.note { border-left: 4px solid #e69f00; padding: .3rem .8rem; background: #fdf6e7; }
.none { color: #555; }
figure { margin: 1rem 0; }
figure img { max-width: 100%; height: auto; display: block; }
figcaption { color: #444; font-size: .84rem; }
pre { font: .74rem/1.4 "DejaVu Sans Mono", monospace; white-space: pre-wrap; overflow-wrap: anywhere;
  background: #f6f6f6; padding: .7rem; }
footer { margin-top: 2.5rem; border-top: 1px solid #ccc; padding-top: .5rem; color: #555; font-size: .8rem; }
@page { size: A4; margin: 14mm; }
@media print {
  body { max-width: none; padding: 0; font-size: 9.5pt; }
  h2, h3, caption { break-after: avoid; }
  tr, figure, .note, .facts div { break-inside: avoid; }
  thead { display: table-header-group; }
  .wide { overflow: visible; }
  .facts { grid-template-columns: 1fr 1fr; }
  table { font-size: 7pt; }
  th, td { padding: .15rem .35rem .15rem 0; }
  .number { font-size: 6.6pt; letter-spacing: -.02em; }
  .hash { font-size: 6pt; }
  details { display: none; }
}
""".strip()

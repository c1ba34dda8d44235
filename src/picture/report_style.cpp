// SPDX-License-Identifier: GPL-2.0-or-later
#include "picture/report_style.h"

#include <array>
#include <cstdio>

#include "picture/palette.h"

namespace foreglow {
namespace {

constexpr const char* rules = R"css(
:root { color-scheme: light dark; --paper: #fbfaf8; --card: #ffffff; --ink: #1c1e26; --faint: #5c606c;
  --line: #dcd9d3; --link: #23509a; --warn: #fff3dc; --warn-line: #c47a12; }
@media (prefers-color-scheme: dark) { :root { --paper: #14161b; --card: #1c1f26; --ink: #e8e6e1; --faint: #a3a6b0;
  --line: #363a44; --link: #9dbcf5; --warn: #33270f; --warn-line: #d79a3a; } }
* { box-sizing: border-box; }
body { margin: 0; background: var(--paper); color: var(--ink);
  font: 16px/1.5 system-ui, -apple-system, "Segoe UI", "DejaVu Sans", sans-serif; overflow-wrap: break-word; }
main, header, footer { max-width: 68rem; margin: 0 auto; padding: 0 1.25rem; }
header { padding-top: 1.6rem; }
h1 { font-size: 1.75rem; line-height: 1.2; margin: 0 0 .4rem; font-weight: 650; letter-spacing: -.01em; }
h2 { font-size: 1.15rem; margin: 2.4rem 0 .7rem; padding-bottom: .3rem; border-bottom: 1px solid var(--line);
  font-weight: 650; }
h3 { font-size: 1rem; margin: 1.2rem 0 .4rem; }
p { margin: .3rem 0; }
a { color: var(--link); }
.subtitle, .note, figcaption, footer { color: var(--faint); }
.warnings { margin: 1.4rem 0 0; padding: .8rem 1.1rem; background: var(--warn); border-left: 4px solid var(--warn-line);
  border-radius: 0 6px 6px 0; }
.warnings h2 { margin: 0 0 .3rem; border: 0; padding: 0; font-size: 1rem; }
.warnings ul { margin: 0; padding-left: 1.2rem; }
dl { margin: 0; display: flex; flex-wrap: wrap; gap: 1px; background: var(--line); border: 1px solid var(--line); border-radius: 6px; overflow: hidden; }
dl > div { flex: 1 1 17rem; background: var(--card); padding: .6rem .9rem; }
dt { color: var(--faint); font-size: .85rem; }
dd { margin: 0; font-variant-numeric: tabular-nums; }
dd .value { font-weight: 600; }
dd .note { display: block; font-size: .85rem; }
.figures { display: grid; grid-template-columns: repeat(auto-fit, minmax(min(100%, 30rem), 1fr)); gap: 1.2rem; }
.odd > :first-child { grid-column: 1 / -1; }
figure { margin: 0; min-width: 0; }
figure img { display: block; width: 100%; height: auto; background: #fff; border: 1px solid var(--line);
  border-radius: 6px; }
figure svg { display: block; width: 100%; height: auto; background: var(--card); border: 1px solid var(--line);
  border-radius: 6px; }
.chart { max-width: 52rem; margin-top: 1rem; overflow-x: auto; }
.chart svg { min-width: 34rem; }
figcaption { font-size: .9rem; margin-top: .4rem; }
.scroll { overflow: auto; max-height: 34rem; border: 1px solid var(--line); border-radius: 6px; background: var(--card); }
table { border-collapse: collapse; width: 100%; font-size: .9rem; font-variant-numeric: tabular-nums; }
th, td { padding: .35rem .8rem; text-align: left; border-bottom: 1px solid var(--line); vertical-align: top; }
th { position: sticky; top: 0; background: var(--card); font-weight: 600; white-space: nowrap; }
tr:last-child td { border-bottom: 0; }
.number { text-align: right; white-space: nowrap; }
code, pre { font-family: ui-monospace, "DejaVu Sans Mono", monospace; font-size: .88em; }
pre { margin: .2rem 0 .9rem; padding: .6rem .9rem; background: var(--card); border: 1px solid var(--line);
  border-radius: 6px; overflow-x: auto; }
footer { margin-top: 2.5rem; padding-top: .8rem; padding-bottom: 2rem; font-size: .85rem; }
@media print { :root { color-scheme: light; --paper: #fff; --card: #fff; --ink: #000; --faint: #444; --line: #bbb;
    --link: #000; --warn: #fff; --warn-line: #555; }
  body { font-size: 10pt; } main, header, footer { max-width: none; padding: 0; }
  .band { print-color-adjust: exact; -webkit-print-color-adjust: exact; }
  .figures { grid-template-columns: 1fr 1fr; gap: .6rem; } .chart { overflow: visible; } .chart svg { min-width: 0; }
  .scroll { max-height: none; overflow: visible; } th { position: static; }
  pre { white-space: pre-wrap; } h2, h3 { break-after: avoid; } figure, dl > div, tr, pre { break-inside: avoid; } }
)css";

}  // namespace

std::string make_report_style() {
    const Palette palette(PaletteKind::Sequential);
    std::string stops;
    constexpr int last = 8;
    for (int i = 0; i <= last; ++i) {
        const Rgb c = palette.at(static_cast<double>(i) / last);
        std::array<char, 16> text{};
        std::snprintf(text.data(), text.size(), ", #%02x%02x%02x", c.red, c.green, c.blue);
        stops += text.data();
    }
    std::string style(rules);
    style += ".band { height: 6px; background: linear-gradient(to right" + stops + "); }\n";
    return style;
}

}  // namespace foreglow

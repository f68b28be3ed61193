#include "cli/report/page_look.hpp"

namespace stillzone::cli {

std::string_view page_style() {
  return R"css(
:root{--paper:#fbfaf6;--card:#fff;--ink:#17262b;--soft:#55666b;--rule:#cfd6d3;--mark:#e9efe9;
--accent:#0d5c63;--warn:#8f2d14;--warnbg:#fbeee6;--tank:#dcebe6;--gas:#8a6a0a;--line:#33505a;
--k0:#0d5c63;--k1:#c9720c;--k2:#7a2e78;--k3:#3f74c4;--k4:#9c2a1c;--k5:#6b8a14;--k6:#222f66;--k7:#7d6652}
@media screen and (prefers-color-scheme:dark){:root{--paper:#11191b;--card:#172326;--ink:#e4ebe8;
--soft:#9fb0b0;--rule:#35474b;--mark:#1f3034;--accent:#6fc9c4;--warn:#ffb08f;--warnbg:#3a2219;
--tank:#24423f;--gas:#e0bd57;--line:#a9c2c6;--k0:#5cc8c2;--k1:#f2a64b;--k2:#d995d8;--k3:#8db6f5;
--k4:#ff8f7d;--k5:#b9d55c;--k6:#b3bdf7;--k7:#cfb79f}}
*{box-sizing:border-box}
html{background:var(--paper);color:var(--ink);font:16px/1.5 "Source Sans 3","Noto Sans","DejaVu Sans",sans-serif;
-webkit-text-size-adjust:100%}
body{margin:0 auto;max-width:1240px;padding:0 28px 40px}
header{border-bottom:6px solid var(--accent);padding:26px 0 12px}
header p{margin:0;color:var(--soft)}
h1{font-size:1.9rem;line-height:1.2;margin:.1em 0;overflow-wrap:anywhere}
h2{font-size:1.3rem;margin:2.2em 0 .5em;padding-left:12px;border-left:6px solid var(--accent);line-height:1.2}
h3{font-size:1.05rem;margin:1.5em 0 .4em}
nav{margin:12px 0;font-size:.92rem}nav a{margin-right:1.1em;white-space:nowrap}
a{color:var(--accent)}
p,li{max-width:78ch}
.answer{background:var(--mark);border-radius:10px;padding:14px 20px;font-size:1.12rem}
.answer p{margin:.35em 0}
.warn{background:var(--warnbg);border-left:6px solid var(--warn);padding:8px 16px;border-radius:0 8px 8px 0;margin:12px 0}
.note{color:var(--soft);font-size:.92rem}
figure{margin:14px 0;padding:12px;background:var(--card);border:1px solid var(--rule);border-radius:10px;break-inside:avoid;min-width:0}
figcaption{font-size:.92rem;color:var(--soft)}figcaption b{color:var(--ink)}
.charts{display:grid;grid-template-columns:repeat(2,minmax(0,1fr));gap:0 18px}
.scroll{overflow-x:auto}
figure svg{display:block;width:100%;height:auto;margin:0 auto}
table{border-collapse:collapse;font-size:.92rem;margin:8px 0}
caption{text-align:left;font-weight:600;padding:4px 0}
th,td{padding:3px 12px 3px 0;text-align:right;border-bottom:1px solid var(--rule);font-variant-numeric:tabular-nums;vertical-align:bottom}
th:first-child,td:first-child,.w{text-align:left}
thead th{border-bottom:2px solid var(--ink);font-weight:600;white-space:pre-line}
tbody tr:hover{background:var(--mark)}
details{margin:10px 0}summary{cursor:pointer;color:var(--accent)}
pre{font:13px/1.45 "DejaVu Sans Mono",monospace;background:var(--card);border:1px solid var(--rule);border-radius:8px;padding:10px;overflow:auto;white-space:pre-wrap;overflow-wrap:anywhere;tab-size:2}
code{font:.88em "DejaVu Sans Mono",monospace;overflow-wrap:anywhere}
.key{list-style:none;display:flex;flex-wrap:wrap;gap:2px 26px;margin:10px 0;padding:0;font-size:.88rem;color:var(--soft)}
.key li{display:flex;align-items:center;gap:8px}.key svg{width:44px!important;flex:none;margin:0}
.sign{display:none}
svg text{font:13.5px "Source Sans 3","Noto Sans","DejaVu Sans",sans-serif;fill:var(--ink)}
svg .q{fill:var(--soft)}svg .b{font-weight:700}svg .e{text-anchor:end}svg .c{text-anchor:middle}
svg .grid{stroke:var(--rule);fill:none}svg .axis{stroke:var(--ink);fill:none}
svg .halo{paint-order:stroke;stroke:var(--card);stroke-width:4px;stroke-linejoin:round}
.s{fill:none;stroke-width:20;stroke-linejoin:round}.mk,.sw{fill:none;stroke-width:2}.mk{fill:var(--card)}
.k0{stroke:var(--k0)}.k1{stroke:var(--k1)}.k2{stroke:var(--k2)}.k3{stroke:var(--k3)}.k4{stroke:var(--k4)}.k5{stroke:var(--k5)}.k6{stroke:var(--k6)}.k7{stroke:var(--k7)}
.s.d1{stroke-dasharray:90 45}.s.d2{stroke-dasharray:25 35}.s.d3{stroke-dasharray:140 40 25 40}.s.d4{stroke-dasharray:50 25}
.sw.d1{stroke-dasharray:9 4.5}.sw.d2{stroke-dasharray:2.5 3.5}.sw.d3{stroke-dasharray:14 4 2.5 4}.sw.d4{stroke-dasharray:5 2.5}
.band{stroke:none;opacity:.22}
.f0{fill:var(--k0)}.f1{fill:var(--k1)}.f2{fill:var(--k2)}.f3{fill:var(--k3)}.f4{fill:var(--k4)}.f5{fill:var(--k5)}.f6{fill:var(--k6)}.f7{fill:var(--k7)}
.tank{fill:var(--tank);stroke:var(--ink);stroke-width:1.6}.hatch{stroke:var(--ink);stroke-width:1.3}
.pipe{fill:none;stroke:var(--line)}.head{fill:var(--line);stroke:none}
.short{stroke:var(--warn);stroke-dasharray:9 5}.headshort,.flag{fill:var(--warn)}svg text.flag{fill:var(--warn);font-weight:700}
.gas{fill:none;stroke:var(--gas);stroke-width:1.3;stroke-dasharray:2 3}.gashead{fill:var(--gas)}
.dome{fill:none;stroke:var(--gas);stroke-width:2}
.bar{fill:var(--k0)}.bar.out{fill:none;stroke:var(--k0);stroke-width:2}
.cursor{stroke:var(--soft);stroke-dasharray:3 3}.tip{fill:var(--card);stroke:var(--rule)}
.pick{fill:var(--accent);opacity:.18}
button{font:inherit;font-size:.85rem;color:var(--accent);background:none;border:1px solid var(--accent);border-radius:6px;padding:1px 10px;cursor:pointer}
@media screen and (max-width:820px){body{padding:0 14px 30px}.charts{grid-template-columns:minmax(0,1fr)}
figure{padding:8px}figure.chart svg text{font-size:17px}h1{font-size:1.5rem}.net svg,.wide svg{width:auto;max-width:none}
.scroll table{white-space:nowrap}.scroll caption{white-space:normal}}
@media print{@page{size:A4;margin:16mm 14mm}html{background:#fff;color:#000;font-size:10.5pt}
:root{--paper:#fff;--card:#fff;--ink:#000;--soft:#333;--mark:#f1f1f1;--rule:#bbb}
body{max-width:none;padding:0}nav,button,.csv,.screen{display:none}.charts{display:block}
figure.chart{max-width:150mm;margin-left:auto;margin-right:auto}figure{border-color:#ccc}
figure svg{max-height:225mm}
h2,h3{break-after:avoid}tr{break-inside:avoid}thead{display:table-header-group}
table{font-size:8.5pt}th,td{padding-right:7px}.scroll{overflow:visible}pre{font-size:7.5pt}a{color:inherit;text-decoration:none}
.sign{display:block;break-inside:avoid;margin-top:14mm}.sign div{display:flex;gap:6mm;margin:9mm 0}.sign span{flex:1;border-top:1px solid #000;padding-top:1mm;font-size:9pt}}
)css";
}

}  // namespace stillzone::cli

# SPDX-License-Identifier: GPL-3.0-or-later
"""The look of the acceptance report, on a screen and on paper, in the colours of views.themes."""

import re

from ..views import themes

CSS = """\
*{box-sizing:border-box}
html{background:var(--hp-ground);color:var(--hp-ink);font:15px/1.5 FONT}
body{margin:0 auto;max-width:980px;padding:24px 20px 60px}
h1{font-size:26px;line-height:1.25;margin:0 0 10px;font-weight:650}
h2{font-size:18px;margin:34px 0 12px;padding-bottom:5px;border-bottom:1px solid var(--hp-rule);font-weight:650}
.banner{display:inline-block;margin:0;padding:6px 16px;font-size:16px;font-weight:600;border-left:5px solid;background:var(--hp-raised)}
.good{border-color:var(--hp-good)}.bad{border-color:var(--hp-bad)}.open{border-color:var(--hp-open)}.quiet{border-color:var(--hp-quiet)}
nav{margin:16px 0 0;display:flex;flex-wrap:wrap;gap:4px 18px}
a{color:var(--hp-exact)}a:focus-visible{outline:2px solid var(--hp-exact);outline-offset:2px}
table{border-collapse:collapse;font-size:13px;margin:0 0 18px}
caption{text-align:left;font-weight:600;padding:0 0 6px}
th,td{padding:4px 12px 4px 0;text-align:left;vertical-align:top}
thead th{border-bottom:1px solid var(--hp-rule);font-weight:600;color:var(--hp-quiet);vertical-align:bottom}
tbody tr+tr>*{border-top:1px solid var(--hp-rule)}
.facts th{font-weight:400;color:var(--hp-quiet);padding-right:28px;white-space:nowrap}
.numbers td{font-variant-numeric:tabular-nums;white-space:nowrap}
code{font:12px/1.4 'DejaVu Sans Mono',ui-monospace,monospace;overflow-wrap:anywhere}
.note{font-size:13px;color:var(--hp-quiet);margin:6px 0}
figure{margin:0 0 20px;overflow-x:auto}figcaption{font-size:13px;color:var(--hp-quiet);margin-top:4px}
figure svg{display:block;max-width:100%;height:auto}
.pair{display:flex;flex-wrap:wrap;gap:10px 24px}.pair>*{flex:1 1 400px}
section{overflow-x:auto}thead th:first-child{min-width:7em}
@media screen and (max-width:640px){figure svg{max-width:none}}
@page{size:A4;margin:12mm 13mm 14mm;@bottom-right{content:counter(page) " / " counter(pages);font:9px FONT}}
@media print{html{font-size:11.5px}body{max-width:none;padding:0}nav{display:none}h1{font-size:20px}
h2{font-size:15px;break-after:avoid;margin:18px 0 8px}.point{break-before:page}table{break-inside:auto}figure{margin:0 0 10px}figcaption{font-size:9.5px;margin-top:2px}figure,tr{break-inside:avoid}section,figure{overflow:visible}
table{font-size:9.5px;width:100%}th,td{padding:3px 7px 3px 0}.numbers td{white-space:normal}
code{font-size:8.5px}figure svg{max-height:230mm;width:auto}.pair{gap:6px 14px}.pair>*{flex:1 1 46%}.note{font-size:9.5px}
.banner{font-size:13px;-webkit-print-color-adjust:exact;print-color-adjust:exact}}
""".replace("FONT", themes.FONT)


def resolved() -> str:
    """The same with the light theme's colours written out, for a converter that resolves no custom properties."""
    return re.sub(r"var\((--hp-[a-z-]+)\)", lambda found: _COLOURS[found.group(1)], CSS)


_COLOURS = {themes.variable(role): colour for role, colour in themes.LIGHT.items()}

# SPDX-License-Identifier: GPL-3.0-or-later
"""
Views of a link, each drawn from the report alone, so that panel, page and file show the same numbers.

A view is a pure function of report(s), settings and size that gives a drawing (drawing.py): primitives with roles
instead of colours. svg.render makes SVG text of it, in the themes of themes.py. `history` takes a Trace or all reports,
`curve` one report a point, the others the latest report.
"""

from .account import account
from .curve import curve
from .decision_map import decision_map
from .drawing import Drawing
from .glance import answers, heading
from .history import history
from .ladder import ladder
from .losses import losses
from .svg import render
from .trace import Trace

# By name, in the order of a screen.
VIEWS = {
    "heading": heading, "ladder": ladder, "decision_map": decision_map, "losses": losses, "history": history, "curve": curve,
    "account": account,
}  # fmt: skip
OF_SEVERAL = ("history", "curve")  # these take a list of reports

__all__ = ["Drawing", "OF_SEVERAL", "Trace", "VIEWS", "answers", "render", *VIEWS]

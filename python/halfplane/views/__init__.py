# SPDX-License-Identifier: GPL-3.0-or-later
"""
Views of a link, each drawn from the report alone, so that panel, page and file show the same numbers.

A view is a pure function of report(s), settings and size that gives a drawing (drawing.py): primitives with roles
instead of colours. svg.render makes SVG text of it, in the themes of themes.py.
"""

from .decision_map import decision_map
from .drawing import Drawing
from .ladder import ladder
from .svg import render

VIEWS = {"ladder": ladder, "decision_map": decision_map}

__all__ = ["Drawing", "VIEWS", "decision_map", "ladder", "render"]

# SPDX-License-Identifier: GPL-3.0-or-later
"""
halfplane: exact error rates of any two-dimensional constellation, and the link that carries it.

The core (sets, rates, intervals, patterns) is here at once. The GNU Radio blocks are loaded when one of them
is first asked for, so that a script or command that only computes starts fast and runs without GNU Radio.
"""

from typing import TYPE_CHECKING

from .captions import set_caption  # noqa: F401
from .core_python import *  # noqa: F401,F403

if TYPE_CHECKING:
    from .blocks_python import *  # noqa: F401,F403

# Names that live in blocks_python, one a block.
_BLOCKS = (
    "aligner",
    "json_to_pmt",
    "error_tally",
    "input_gauge",
    "known_spans",
    "link_log",
    "link_watch",
    "llr_detector",
    "noise_at",
    "pmt_to_json",
    "point_detector",
    "point_mapper",
    "test_pattern",
)


# Blocks in Python: where each stands, and the Debian packages it needs beyond what the others need.
_SHOWING = {
    "link_page": ("page.block", "python3-aiohttp python3-prometheus-client"),
    "link_panel": ("panel.block", "python3-pyqt5 python3-pyqtgraph"),
}


def __getattr__(name):
    """Loads the blocks when one of them is first asked for (PEP 562)."""
    if name in _SHOWING:
        block = globals()[name] = _load(name, *_SHOWING[name])
        return block
    if name in _BLOCKS:
        from . import blocks_python

        block = globals()[name] = getattr(blocks_python, name)
        return block
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")


def _load(name, where, packages):
    """A block that not every system can run: without its packages the rest of the module works all the same."""
    import importlib

    try:
        return getattr(importlib.import_module(f"{__name__}.{where}"), name)
    except ModuleNotFoundError as error:
        if (error.name or "").split(".")[0] in ("gnuradio", "pmt"):
            raise
        raise ImportError(f"{name} needs the Python module {error.name!r}; on Debian: apt install {packages}", name=error.name) from error


def __dir__():
    return sorted([*globals(), *_BLOCKS, *_SHOWING])

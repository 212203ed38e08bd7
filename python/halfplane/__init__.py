# SPDX-License-Identifier: GPL-3.0-or-later
"""
halfplane: exact error rates of any two-dimensional constellation, and the link that carries it.

The core (sets, rates, intervals, patterns) is here at once. The GNU Radio blocks are loaded when one of them
is first asked for, so that a script or command that only computes starts fast and runs without GNU Radio.
"""

from .captions import set_caption  # noqa: F401
from .core_python import *  # noqa: F401,F403

# Names that live in blocks_python, one a block.
_BLOCKS = (
    "aligner",
    "json_to_pmt",
    "link_log",
    "link_watch",
    "noise_at",
    "pmt_to_json",
    "point_detector",
    "point_mapper",
    "test_pattern",
)


def __getattr__(name):
    """Loads the blocks when one of them is first asked for (PEP 562)."""
    if name in _BLOCKS:
        from . import blocks_python

        block = globals()[name] = getattr(blocks_python, name)
        return block
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")


def __dir__():
    return sorted([*globals(), *_BLOCKS])

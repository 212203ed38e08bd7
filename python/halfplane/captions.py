# SPDX-License-Identifier: GPL-3.0-or-later
"""Short texts about things, for places with room for a line."""

from .core_python import load_set, signal_set


def set_caption(which):
    """
    'Set: 12 points, Es 3.858, closest 1.414 apart' for a signal_set, or for the text of one as load_set takes it.

    Where there is no such set it says so and never raises: it labels a parameter that is being typed.
    """
    try:
        shown = which if isinstance(which, signal_set) else load_set(str(which))
    except (ValueError, OSError):
        return "Set: not one yet"
    return f"Set: {shown.size} points, Es {shown.es:.4g}, closest {shown.d_min:.4g} apart"

# SPDX-License-Identifier: GPL-3.0-or-later
"""
Light and dark: a colour for every role. The lightness of `more` and `fewer`, and of the four rungs, differs as well as
their hue; orange against blue is told apart under every common colour deficiency.
"""

from __future__ import annotations

from .drawing import ROLES

LIGHT = {
    "ground": "#ffffff", "raised": "#f5f7f8", "rule": "#dde3e7", "ink": "#1f2d38", "quiet": "#5b6975",
    "measured": "#a4243b", "measured_soft": "#dfa3ad",
    "exact": "#16425b", "facing": "#a9620f", "union": "#7d8a95", "nearest": "#317364", "target": "#5a3e8e",
    "more": "#c1501a", "fewer": "#2f74b5", "even": "#eef1f3",
    "gap": "#d7dde2", "slip": "#8e4fa3", "overflow": "#b0720c", "lost": "#56636e", "before": "#a6b0b9",
    "loss": "#3a6f96", "rest": "#82909b",
    "good": "#23705b", "bad": "#a4243b", "open": "#8a5a00",
}  # fmt: skip

DARK = {
    "ground": "#12181d", "raised": "#1a2229", "rule": "#2c3740", "ink": "#e6ecf0", "quiet": "#9aa8b3",
    "measured": "#f08497", "measured_soft": "#7d3f4b",
    "exact": "#8cc4e8", "facing": "#e3a75c", "union": "#98a5b0", "nearest": "#69bfa9", "target": "#b9a0e8",
    "more": "#ee8a4f", "fewer": "#6aa9e6", "even": "#222c34",
    "gap": "#36424c", "slip": "#c58fd8", "overflow": "#dda04a", "lost": "#93a1ac", "before": "#5d6a75",
    "loss": "#6ea6cd", "rest": "#7b8893",
    "good": "#6cc4a8", "bad": "#f08497", "open": "#e0b052",
}  # fmt: skip

THEMES = {"light": LIGHT, "dark": DARK}
FONT = "system-ui, 'Segoe UI', 'Noto Sans', 'Liberation Sans', 'DejaVu Sans', sans-serif"


def variable(role: str) -> str:
    """Name of the CSS custom property of a role."""
    return "--hp-" + role.replace("_", "-")


def properties(theme: str) -> str:
    """The custom properties of a theme as CSS declarations."""
    return "".join(f"{variable(role)}:{THEMES[theme][role]};" for role in ROLES)


def stylesheet() -> str:
    """
    CSS of the roles for a page that carries drawings rendered with theme "page": light unless an element up the tree has
    data-theme="dark", or has data-theme="system" and the system asks for dark. On paper always light.
    """
    return (
        f":root,[data-theme=light]{{{properties('light')}}}\n"
        f"[data-theme=dark]{{{properties('dark')}}}\n"
        f"@media (prefers-color-scheme:dark){{[data-theme=system]{{{properties('dark')}}}}}\n"
        f"@media print{{:root,[data-theme]{{{properties('light')}}}}}\n"
    )

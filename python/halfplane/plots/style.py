# SPDX-License-Identifier: GPL-3.0-or-later
"""The look of every plot: colours that differ in lightness as well as hue, a line style a rung, units on the axes."""

import functools
import math
from pathlib import Path

import matplotlib
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.ticker import FuncFormatter, MaxNLocator, NullFormatter

# Ink on paper. Told apart in greyscale and under the common colour deficiencies by lightness; by style in print.
ES_N0, EB_N0 = "$E_\\mathrm{s}/N_0$", "$E_\\mathrm{b}/N_0$"
INK, SOFT, GRID = "#22303c", "#6b7885", "#e3e7ea"
RUNGS = {
    "exact": {"color": "#16425b", "linestyle": "-", "linewidth": 2.8, "label": "exact"},
    "facing": {"color": "#d1801f", "linestyle": (0, (6, 2)), "linewidth": 1.4, "label": "facing bound"},
    "union": {"color": "#8f9aa5", "linestyle": (0, (7, 2, 1.2, 2)), "linewidth": 1.4, "label": "union bound"},
    "nearest": {"color": "#4f9d8a", "linestyle": (0, (1.2, 1.6)), "linewidth": 1.9, "label": "nearest neighbours"},
}
BER_LABELS = {"facing": "facing (approximation)"}
# A measured point, at the Es/N0 ahead of the receiver or at the one gauged from the points that it decided on.
MEASURED = {
    "input": {"color": "#a4243b", "marker": "o"},
    "decision": {"color": "#3a7d6d", "marker": "s", "markerfacecolor": "white"},
}
BARS = {"linestyle": "none", "markersize": 5.5, "capsize": 2.5, "elinewidth": 1.1, "markeredgewidth": 1.3}

_SETTINGS = {
    "font.family": "DejaVu Sans",
    "font.size": 9.5,
    "axes.edgecolor": SOFT,
    "axes.labelcolor": INK,
    "axes.titlesize": 10.5,
    "axes.titlecolor": INK,
    "axes.titlelocation": "left",
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.grid": True,
    "axes.axisbelow": True,
    "grid.color": GRID,
    "grid.linewidth": 0.8,
    "xtick.color": SOFT,
    "ytick.color": SOFT,
    "xtick.labelcolor": INK,
    "ytick.labelcolor": INK,
    "text.color": INK,
    "legend.frameon": True,
    "legend.edgecolor": "none",
    "legend.framealpha": 0.9,
    "legend.labelcolor": INK,
    "errorbar.capsize": 2.5,
    "lines.solid_capstyle": "round",
    "legend.handlelength": 3.2,
    "svg.hashsalt": "halfplane",
    "svg.fonttype": "path",
    "path.simplify": True,
}


def styled(draw):
    """Runs a drawing function under our settings; matplotlib reads some of them only when a thing is drawn."""

    @functools.wraps(draw)
    def drawn(*arguments, **options):
        with matplotlib.rc_context(_SETTINGS):
            return draw(*arguments, **options)

    return drawn


def figure(width, height, columns=1, **share):
    """An empty figure of our look, size in inches → (figure, list of axes)."""
    made = Figure(figsize=(width, height), layout="constrained", facecolor="white")
    FigureCanvasAgg(made)
    axes = made.subplots(1, columns, squeeze=False, **share)[0]
    return made, list(axes)


def headline(made, text):
    """The line at the top left: what is shown."""
    made.suptitle(text, x=0.012, ha="left", color=INK, fontsize=11.5, fontweight="bold")


def save(made, path):
    """Writes the figure in the format that the file's ending names. The same input gives the same bytes."""
    ending = Path(path).suffix.lower()
    dateless = {
        ".svg": {"Date": None, "Creator": "halfplane"},
        ".pdf": {"CreationDate": None},
        ".png": {"Software": "halfplane"},
    }
    made.savefig(path, dpi=160, metadata=dateless.get(ending))


def log_rate_axis(axes, lowest_ln, highest_ln=0.0):
    """
    A vertical axis of log10(rate), so that a rate below the smallest double has its place too. Data go in as log10.
    lowest_ln, highest_ln: natural logarithms that must be on it.
    """
    low = math.floor(lowest_ln / math.log(10))
    high = max(0, math.ceil(highest_ln / math.log(10)))
    low = min(low, high - 1)
    axes.set_ylim(low - 0.02 * (high - low), high + 0.02 * (high - low))
    axes.yaxis.set_major_locator(MaxNLocator(nbins=10, integer=True, steps=[1, 2, 5, 10]))
    axes.yaxis.set_major_formatter(FuncFormatter(lambda value, _: "1" if round(value) == 0 else f"$10^{{{value:.0f}}}$"))
    if high - low <= 12:
        axes.yaxis.set_minor_locator(_WithinDecades())
        axes.yaxis.set_minor_formatter(NullFormatter())
        axes.grid(True, which="minor", axis="y", color=GRID, linewidth=0.35)
        axes.tick_params(which="minor", left=False)


class _WithinDecades(MaxNLocator):
    """Ticks at 2…9 within each decade of a log10 axis."""

    def tick_values(self, low, high):
        return [d + math.log10(k) for d in range(math.floor(low), math.ceil(high)) for k in range(2, 10)]

    def __call__(self):
        return self.tick_values(*self.axis.get_view_interval())


def log10_rates(rows, rung, kind):
    """log10 of a rate over the rows of a curve document."""
    return [row[rung]["ln_" + kind] / math.log(10) for row in rows]

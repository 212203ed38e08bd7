# SPDX-License-Identifier: GPL-3.0-or-later
"""The four rungs against Es/N0, SER beside BER."""

from . import style

TITLES = {"ser": "Symbol error rate", "ber": "Bit error rate"}


@style.styled
def draw(document, path):
    """Draws a document of `curve` (see documents.curve) into a file: .svg, .png or .pdf."""
    rows = document["rows"]
    made, panels = style.figure(9.6, 4.6, columns=2, sharex=True)
    for axes, kind in zip(panels, ("ser", "ber")):
        rungs(axes, rows, kind)
        axes.set_title(TITLES[kind])
        axes.set_xlabel(style.ES_N0 + " (dB)")
        axes.set_ylabel(kind.upper())
        eb_axis(axes, rows)
        axes.legend(*in_order(axes), loc="lower left")
    facts = document["set"]
    style.headline(
        made,
        f"{facts.get('name') or 'set'} · {facts['size']} points · {document['law']} · {document['detector']} detector",
    )
    style.save(made, path)


def rungs(axes, rows, kind):
    """The four rungs of one rate, on an axis of log10(rate)."""
    x = [row["es_n0_db"] for row in rows]
    marker = "o" if len(rows) == 1 else None
    for rung in ("exact", "union", "facing", "nearest"):
        look = dict(style.RUNGS[rung])
        if kind == "ber":
            look["label"] = style.BER_LABELS.get(rung, look["label"])
        axes.plot(x, style.log10_rates(rows, rung, kind), marker=marker, **look)
    if len(rows) == 1:
        axes.set_xlim(x[0] - 1, x[0] + 1)
    lows = [row[rung]["ln_" + kind] for row in rows for rung in style.RUNGS]
    style.log_rate_axis(axes, min(lows), max(lows))


def in_order(axes):
    """Handles and labels for a legend: the exact rate first, then the bounds, then what was measured."""
    handles, labels = axes.get_legend_handles_labels()
    drawn = len(style.RUNGS)
    order = [0, 2, 1, 3, *range(drawn, len(labels))]
    return [handles[k] for k in order], [labels[k] for k in order]


def eb_axis(axes, rows):
    """Eb/N0 on a second axis above."""
    shift = rows[0]["eb_n0_db"] - rows[0]["es_n0_db"]
    upper = axes.secondary_xaxis("top", functions=(lambda x: x + shift, lambda x: x - shift))
    upper.set_xlabel(style.EB_N0 + " (dB)", color=style.SOFT, fontsize=8.5)
    upper.tick_params(colors=style.SOFT, labelcolor=style.SOFT, labelsize=8)
    upper.spines["top"].set_color(style.GRID)

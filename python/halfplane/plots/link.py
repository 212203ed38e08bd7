# SPDX-License-Identifier: GPL-3.0-or-later
"""Plots of a measured link: its points over the four curves, and its shortfall. Both take reports (measured steps)."""

import math

from . import curves, style

@style.styled
def draw_points(document, reports, path):
    """
    Measured SER and BER with their intervals over the curves.

    document: of `curve` (documents.curve) over the range to show. reports: one a step, as link_watch puts them out.
    A step without errors is drawn as its upper end, an arrow down. path: .svg, .png or .pdf.
    """
    rows = document["rows"]
    made, panels = style.figure(9.6, 4.8, columns=2, sharex=True)
    for axes, kind in zip(panels, ("ser", "ber")):
        curves.rungs(axes, rows, kind)
        for place in style.MEASURED:
            _points(axes, reports, kind, place)
        axes.set_title(curves.TITLES[kind])
        axes.set_xlabel(style.ES_N0 + " (dB)")
        axes.set_ylabel(kind.upper())
        axes.legend(*curves.in_order(axes), loc="lower left", fontsize=8.5)
        curves.eb_axis(axes, rows)
        _frame(axes, rows, reports, kind)
    style.headline(made, _title(reports))
    style.save(made, path)


@style.styled
def draw_shortfall(reports, path):
    """Shortfall at the decision and at the input against the Es/N0 at the input, with intervals."""
    made, (axes,) = style.figure(6.6, 4.3)
    axes.axhline(0, color=style.INK, linewidth=1)
    drawn = False
    for place, look in style.MEASURED.items():
        known = [(es_n0_db(report, "input"), report["shortfall"][place]) for report in reports
                 if place in report.get("shortfall", {}) and es_n0_db(report, "input") is not None]  # fmt: skip
        if not known:
            continue
        drawn = True
        x = [at for at, _ in known]
        y = [fall["db"] for _, fall in known]
        below = [max(0.0, fall["db"] - fall.get("db_low", fall["db"])) for _, fall in known]
        above = [max(0.0, fall.get("db_high", fall["db"]) - fall["db"]) for _, fall in known]
        axes.plot(x, y, color=look["color"], linewidth=0.9, alpha=0.45)
        axes.errorbar(x, y, [below, above], label=f"at the {place}", **{**style.BARS, **look})
    if not drawn:
        axes.text(0.5, 0.55, "no step had the 20 errors that a shortfall takes", transform=axes.transAxes, ha="center", color=style.SOFT)
    low, high = axes.get_ylim()
    axes.set_ylim(min(low, -0.1), max(high, 0.1))
    axes.annotate("what the constellation permits", (1, 0), xycoords=("axes fraction", "data"), xytext=(-2, -4),
                  textcoords="offset points", ha="right", va="top", fontsize=8.5, color=style.SOFT)  # fmt: skip
    axes.set_xlabel(style.ES_N0 + " at the input (dB)")
    axes.set_ylabel("Shortfall (dB)")
    axes.set_title("How far the link falls short of the exact curve")
    if drawn:
        axes.legend(loc="best")
    style.headline(made, _title(reports))
    style.save(made, path)


def es_n0_db(report, place):
    """Es/N0 in dB of a report's whole run, at the input or at the decision; None where not known."""
    return report.get("input" if place == "input" else "total", {}).get("es_n0_db")


def _points(axes, reports, kind, place):
    solid, open_ = [], []
    for report in reports:
        at, total = es_n0_db(report, place), report["total"]
        if at is None or kind + "_high" not in total:
            continue
        (solid if total.get(kind, 0) > 0 else open_).append((at, total))
    if solid:
        lg = math.log10
        x = [at for at, _ in solid]
        y = [lg(total[kind]) for _, total in solid]
        below = [lg(t[kind]) - lg(t[kind + "_low"]) if t.get(kind + "_low", 0) > 0 else 0 for _, t in solid]
        above = [lg(t[kind + "_high"]) - lg(t[kind]) for _, t in solid]
        label = {"input": f"counted, {style.ES_N0} at the input", "decision": f"counted, {style.ES_N0} as gauged"}[place]
        axes.errorbar(x, y, [below, above], zorder=5, label=label, **{**style.BARS, **style.MEASURED[place]})
    if open_:
        look = {**style.MEASURED[place], "marker": "v"}
        axes.plot([at for at, _ in open_], [math.log10(t[kind + "_high"]) for _, t in open_], linestyle="none", zorder=5, **look)


def _frame(axes, rows, reports, kind):
    """Room for what was measured and one decade below, not for all that the curves do beyond."""
    measured = [report["total"][kind + "_high"] for report in reports if report["total"].get(kind + "_high", 0) > 0]
    counted = [report["total"][kind] for report in reports if report["total"].get(kind, 0) > 0]
    if measured:
        highest = max(row[rung]["ln_" + kind] for row in rows for rung in style.RUNGS)
        style.log_rate_axis(axes, math.log(min(measured + counted)) - 0.7 * math.log(10), highest)


def _title(reports):
    report = reports[0] if reports else {}
    parts = [report.get("set"), report.get("pattern"), report.get("law")]
    return " · ".join(part for part in parts if part) or "link"

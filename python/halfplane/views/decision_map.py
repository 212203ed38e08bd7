# SPDX-License-Identifier: GPL-3.0-or-later
"""Decision map: the cells as tiles, each by its errors against expectation; between facing cells arrows for the transitions."""

from __future__ import annotations

import math
from statistics import NormalDist

from . import basis, legend, lettering, words
from .axes import LinearAxis
from .drawing import Arrow, Cloud, Drawing, Line, Mark, Polygon, Text

SIZE = (560.0, 600.0)
# A tile or an arrow takes a colour where its count departs so far from expectation that chance would colour any of all
# that are shown only so often.
CHANCE = 0.01
_LEFT, _RIGHT, _TOP = 46.0, 14.0, 10.0
_MOST_DOTS = 2000
LABELS, SAMPLES = "labels", "samples"  # layers of the drawing
# Smallest letters of labels, in units; smaller ones nobody reads.
_LEAST_LETTERS = 6.0
_ENTRIES = [
    legend.Entry("swatch", "fewer", "fewer errors than expected", strength=0.55, sign="minus"),
    legend.Entry("swatch", "even", "as expected", sign="circle"),
    legend.Entry("swatch", "more", "more", strength=0.55, sign="plus"),
]


def decision_map(
    report: dict, settings: dict | None, size: tuple[float, float] = SIZE, labels: bool = False, cloud=None
) -> Drawing:
    """
    labels: write each point's bits; where they cannot be read at this size, the map says so instead. cloud: recent corrected
    samples, complex, in the set's unit; the latest 2,000 are drawn. Both are layers of their own. Tiles of sets of more than
    256 points are plain: reports count no transitions for them.
    """
    out = Drawing("decision_map", *size, title="Decision cells, and errors against expectation")
    link = basis.of(settings)
    if link is None:
        out.description = "The set is not known yet."
        out.add(Text(_RIGHT, 24, "The set is not known yet", "quiet", 13))
        return out
    total = report.get("total", {})
    errors = link.errors_by_point(total)
    entries = _ENTRIES if errors is not None else []
    foot = 66 + legend.height(entries, size[0] - 24)
    plane = _Plane(link.set.points, link.set.d_min, (size[0], size[1] - foot))
    dispersion = total.get("dispersion", 1.0)
    detailed = link.set.size <= basis.MOST_POINTS_IN_DETAIL
    clear = clear_deviation(link.set.size + len(total.get("transitions", ())))

    said = _draw_tiles(out, link, plane, total, errors, dispersion, clear)
    plane.draw_axes(out)
    if cloud is not None and len(cloud):
        dots = [(plane.x(y.real), plane.y(y.imag)) for y in list(cloud)[-_MOST_DOTS:]]
        out.add(Cloud(tuple(dot for dot in dots if plane.holds(*dot)), "ink", 2.4, 0.5, SAMPLES))
    if detailed:
        _draw_arrows(out, link, plane, total, dispersion, clear)
    letters = _letters(link, plane) if labels else 0.0
    _draw_points(out, link, plane, errors, dispersion, clear, letters if detailed and letters >= _LEAST_LETTERS else 0.0)
    _draw_legend(out, link, total, entries)
    if labels and not (detailed and letters >= _LEAST_LETTERS):
        said = f"{words.count(link.set.size)} labels are too many to be read at this size"
        out.add(Text(out.width / 2, _TOP + 15, said, "ink", 11, "middle", bold=True, halo=True, layer=LABELS))
    out.description = _description(link, total, said)
    return out


def clear_deviation(shown: int) -> float:
    """Standard deviations that one of so many counts exceeds by chance, either way, once in 1/CHANCE."""
    return NormalDist().inv_cdf(1 - CHANCE / (2 * max(1, shown)))


class _Plane:
    """Where the plane of the set lies in the drawing: both axes to one scale."""

    def __init__(self, points, d_min: float, size: tuple[float, float]):
        width, height = size[0] - _LEFT - _RIGHT, size[1] - _TOP
        i, q = points.real, points.imag
        middle = complex((i.max() + i.min()) / 2, (q.max() + q.min()) / 2)
        reach_i, reach_q = (i.max() - i.min()) / 2, (q.max() - q.min()) / 2
        air = max(0.6 * d_min, 0.14 * max(reach_i, reach_q))
        reach_i, reach_q = reach_i + air, reach_q + air
        # A set on a line gets some height; beyond that the frame is the set's.
        reach_i, reach_q = max(reach_i, 0.45 * reach_q), max(reach_q, 0.45 * reach_i)
        self.scale = min(width / reach_i, height / reach_q) / 2
        left = _LEFT + (width - 2 * reach_i * self.scale) / 2
        self.frame = (float(middle.real - reach_i), float(middle.real + reach_i), float(middle.imag - reach_q), float(middle.imag + reach_q))
        self.box = (left, _TOP, 2 * reach_i * self.scale, 2 * reach_q * self.scale)

    def x(self, i: float) -> float:
        return self.box[0] + (i - self.frame[0]) * self.scale

    def y(self, q: float) -> float:
        return self.box[1] + (self.frame[3] - q) * self.scale

    def holds(self, x: float, y: float) -> bool:
        return 0 <= x - self.box[0] <= self.box[2] and 0 <= y - self.box[1] <= self.box[3]

    def draw_axes(self, out: Drawing) -> None:
        x, y, width, height = self.box
        below, beside = y + height, x
        for axis, vertical in ((LinearAxis(*self.frame[:2], x, x + width, 5), False), (LinearAxis(*self.frame[2:], below, y, 5), True)):
            for value, label in axis.ticks():
                at = axis(value)
                if vertical:
                    out.add(Line(((beside - 4, at), (beside, at)), "quiet"))
                    out.add(Text(beside - 7, at + 4, label, "quiet", 10.5, "end"))
                else:
                    out.add(Line(((at, below), (at, below + 4)), "quiet"))
                    out.add(Text(at, below + 15, label, "quiet", 10.5, "middle"))
        out.add(Text(out.width / 2, below + 28, "across in phase, up in quadrature (the set's unit)", "quiet", 10.5, "middle"))


def _draw_tiles(out: Drawing, link, plane: _Plane, total: dict, errors, dispersion: float, clear: float) -> list[str]:
    """Returns what the clearly coloured tiles say."""
    said = []
    shapes = link.outlines(plane.frame, total.get("es_n0_db"))
    names = link.set.label_strings
    fine = link.set.size > basis.MOST_POINTS_IN_DETAIL
    for i, shape in enumerate(shapes):
        if len(shape) == 0:
            continue
        role, strength, note = "even", 1.0, "" if fine else names[i]
        if errors is not None:
            counted, expected = errors[0][i], errors[1][i]
            note = f"{names[i]}: {words.count(counted)} errors, expected {_expected(expected)}"
            if abs(basis.deviation(counted, expected, dispersion)) >= clear:
                ratio = counted / expected if expected > 0 else math.inf
                role, strength = ("more" if ratio > 1 else "fewer"), _strength(ratio)
                said.append(f"{names[i]} {words.factor(ratio)} ×" if math.isfinite(ratio) else names[i])
        corners = tuple((plane.x(v.real), plane.y(v.imag)) for v in shape)
        out.add(Polygon(corners, role, "ground", 0.5 if fine else 1.5, strength, note=note))
    return said


def _strength(ratio: float) -> float:
    """Opacity of a clear departure: full from a factor of four on."""
    if ratio <= 0 or not math.isfinite(ratio):
        return 0.85
    return 0.22 + 0.63 * min(1.0, abs(math.log2(ratio)) / 2)


def _expected(value: float) -> str:
    return words.count(value) if value >= 100 else f"{value:.3g}"


def _sign(room: float) -> float:
    return min(11.0, max(5.0, 0.3 * room))


def _letters(link, plane: _Plane) -> float:
    """Size of letters at which a label fits between its point's sign and the neighbours."""
    room = plane.scale * link.set.d_min
    return min(11.0, 0.8 * room / max(1.0, lettering.width(link.set.label_strings[0], 1.0)), 0.28 * room)


def _draw_points(out: Drawing, link, plane: _Plane, errors, dispersion: float, clear: float, letters: float) -> None:
    points, names = link.set.points, link.set.label_strings
    room = plane.scale * link.set.d_min
    if link.set.size > basis.MOST_POINTS_IN_DETAIL:
        out.add(Cloud(tuple((plane.x(p.real), plane.y(p.imag)) for p in points), "ink", max(1.0, min(2.4, 0.25 * room)), 0.9))
        return
    sign = _sign(room)
    for i, point in enumerate(points):
        x, y = plane.x(point.real), plane.y(point.imag)
        off = basis.deviation(errors[0][i], errors[1][i], dispersion) if errors is not None else 0.0
        if abs(off) >= clear:
            out.add(Mark(x, y, "plus" if off > 0 else "minus", "ink", sign, note=names[i]))
        else:
            out.add(Mark(x, y, "circle", "ink", min(4.5, 0.16 * room), note=names[i]))
        if letters:
            out.add(Text(x, y + sign / 2 + letters + 1, names[i], "ink", letters, "middle", halo=True, layer=LABELS))


def _draw_arrows(out: Drawing, link, plane: _Plane, total: dict, dispersion: float, clear: float) -> None:
    """One arrow a counted transition between facing cells, across their border, from sent to decided."""
    es_n0_db = total.get("es_n0_db")
    if es_n0_db is None or not total.get("transitions"):
        return
    facing = link.predictor.facing(es_n0_db)
    points, priors, names = link.set.points, link.set.priors, link.set.label_strings
    n0 = link.n0(es_n0_db) if link.map_cells else 0.0
    for source, to, counted, *expected in total["transitions"]:
        if not expected or to not in facing[source]:
            continue
        a, b = points[source], points[to]
        distance = abs(b - a)
        on_screen = distance * plane.scale
        if on_screen < 18:
            continue
        # Where the border crosses the line between both points.
        along = 0.5 + n0 * math.log(priors[source] / priors[to]) / (2 * distance**2)
        middle = a + (b - a) * min(0.9, max(0.1, along))
        x, y = plane.x(middle.real), plane.y(middle.imag)
        ux, uy = (b - a).real / distance, -(b - a).imag / distance
        # Two are added to both, so that a chance error on a rare way is no thick arrow.
        ratio = (counted + 2) / (expected[0] + 2)
        wide = min(7.0, max(0.5, 1.6 * ratio), 0.16 * on_screen)
        reach, aside = min(15.0, 0.21 * on_screen), 2.2 + wide / 2
        x, y = x - uy * aside, y + ux * aside
        off = basis.deviation(counted, expected[0], dispersion)
        role = "quiet" if abs(off) < clear else "more" if off > 0 else "fewer"
        note = f"{names[source]} decided as {names[to]}: {words.count(counted)}, expected {_expected(expected[0])}"
        out.add(
            Arrow(x - ux * reach, y - uy * reach, x + ux * reach, y + uy * reach, role, wide, 0.6 if role == "quiet" else 1.0, note)
        )


def _draw_legend(out: Drawing, link, total: dict, entries: list[legend.Entry]) -> None:
    legend.draw(out, entries, 14, out.height - 33 - legend.height(entries, out.width - 24), out.width - 24)
    cells = "MAP cells" if link.map_cells else "nearest-point cells"
    if link.map_cells and "es_n0_db" in total:
        cells += f" at {words.db(total['es_n0_db'], 1)} dB"
    if link.set.size > basis.MOST_POINTS_IN_DETAIL:
        said = f"{cells}; sets above {basis.MOST_POINTS_IN_DETAIL} points are not counted cell by cell"
    elif not entries:
        said = f"{cells}; errors cell by cell {words.UNKNOWN}"
    else:
        said = f"{cells}; an arrow leads from sent to decided, its width is the count over its expectation"
    for k, line in enumerate(lettering.wrapped(said, out.width - 24, 10.5)[:2]):
        out.add(Text(14, out.height - 20 + 14 * k, line, "quiet", 10.5))


def _description(link, total: dict, said: list[str]) -> str:
    text = f"{link.set.size} decision cells."
    if said:
        more = f" and {len(said) - 12} others" if len(said) > 12 else ""
        text += " Errors clearly off expectation, as a multiple of it: " + ", ".join(said[:12]) + more + "."
    elif "transitions" in total:
        text += " No cell's errors depart clearly from expectation."
    return text

# SPDX-License-Identifier: GPL-3.0-or-later
"""A drawing as SVG text. The same drawing gives the same bytes."""

from __future__ import annotations

import hashlib
from collections.abc import Callable
from html import escape

from . import themes
from .drawing import CORNERS, DASHES, STROKES, Arrow, Bar, Cloud, Drawing, Line, Mark, Polygon, Text

Palette = Callable[[str], str]


def render(drawing: Drawing, theme: str = "light", key: str = "") -> str:
    """
    One `<svg>` element, with title and description for screen readers.

    theme: "light" or "dark" write the colours out: a file of its own, or for a converter that knows no CSS. "page" names
    them by CSS custom properties, for a page that carries themes.stylesheet(); there the one SVG follows the page's
    theme, and no style attribute stands in it, so that a strict content security policy may hold. What is of a layer has the
    class hp-LAYER.

    key: told apart by it are drawings on one page that say the same (ids must not stand twice).
    """
    if theme == "page":
        palette: Palette = lambda role: f"var({themes.variable(role)})"  # noqa: E731
    else:
        palette = themes.THEMES[theme].__getitem__
    # Ids are the page's: what a drawing refers to is named by what it says.
    said = "\n".join((drawing.view, drawing.title, drawing.description, theme, key))
    key = hashlib.sha256(said.encode()).hexdigest()[:10]
    body = [line for item in drawing.items for line in _DRAWN[type(item)](item, palette, key)]
    hatches = sorted({item.edge or "rest" for item in drawing.items if getattr(item, "hatch", False)})
    defs = "".join(_hatching(role, palette, key) for role in hatches)
    size = f'width="{_n(drawing.width)}" height="{_n(drawing.height)}" viewBox="0 0 {_n(drawing.width)} {_n(drawing.height)}"'
    ground = "" if theme == "page" else f'<rect width="100%" height="100%" fill="{palette("ground")}"/>\n'
    return (
        f'<svg xmlns="http://www.w3.org/2000/svg" {size} role="img" aria-labelledby="t{key} d{key}" class="hp-view hp-{drawing.view}" '
        f'font-family="{escape(themes.FONT)}">\n'
        f'<title id="t{key}">{escape(drawing.title)}</title>\n<desc id="d{key}">{escape(drawing.description)}</desc>\n'
        + (f"<defs>{defs}</defs>\n" if defs else "")
        + ground
        + "\n".join(body)
        + "\n</svg>\n"
    )


def _n(value: float) -> str:
    """A coordinate, to a hundredth; a drawing never holds one that is not finite."""
    text = "%.2f" % value
    if text[-1] in "nf":
        raise ValueError(f"a coordinate of a drawing is {value}")
    text = text.rstrip("0").rstrip(".")
    return "0" if text == "-0" else text


def _points(points) -> str:
    return " ".join(f"{_n(x)},{_n(y)}" for x, y in points)


def _element(name: str, attributes: dict[str, str | None], note: str = "", content: str = "") -> str:
    written = "".join(f' {key}="{value}"' for key, value in attributes.items() if value is not None)
    inside = (f"<title>{escape(note)}</title>" if note else "") + content
    return f"<{name}{written}>{inside}</{name}>" if inside else f"<{name}{written}/>"


def _surface(item: Bar | Polygon | Arrow, palette: Palette) -> dict[str, str | None]:
    edge = getattr(item, "edge", None)
    return {
        "fill": palette(item.role) if item.role else "none",
        "fill-opacity": _n(item.strength) if item.role and item.strength < 1 else None,
        "stroke": palette(edge) if edge else None,
        "stroke-width": _n(item.edge_width) if edge and item.edge_width != 1 else None,
        "stroke-linejoin": "round" if edge else None,
    }


def _hatching(role: str, palette: Palette, key: str) -> str:
    return (
        f'<pattern id="h{key}{role}" width="6" height="6" patternUnits="userSpaceOnUse">'
        f'<path d="M-1.5,1.5l3,-3M0,6l6,-6M4.5,7.5l3,-3" stroke="{palette(role)}" stroke-width="1.2" fill="none"/></pattern>'
    )


def _bar(item: Bar, palette: Palette, key: str):
    box: dict[str, str | None] = {"x": _n(item.x), "y": _n(item.y), "width": _n(max(0, item.width)), "height": _n(max(0, item.height))}
    if item.round:
        box["rx"] = _n(item.round)
    yield _element("rect", {**box, **_surface(item, palette)}, item.note)
    if item.hatch:
        yield _element("rect", {**box, "fill": f"url(#h{key}{item.edge or 'rest'})"})


def _polygon(item: Polygon, palette: Palette, key: str):
    yield _element("polygon", {"points": _points(item.points), **_surface(item, palette)}, item.note)
    if item.hatch:
        yield _element("polygon", {"points": _points(item.points), "fill": f"url(#h{key}{item.edge or 'rest'})"})


def _arrow(item: Arrow, palette: Palette, key: str):
    if outline := item.outline():
        yield _element("polygon", {"points": _points(outline), **_surface(item, palette)}, item.note)


def _line(item: Line, palette: Palette, key: str):
    dash = DASHES[item.dash]
    yield _element(
        "polyline",
        {
            "points": _points(item.points),
            "fill": "none",
            "stroke": palette(item.role),
            "stroke-width": _n(item.width) if item.width != 1 else None,
            "stroke-dasharray": " ".join(map(_n, dash)) if dash else None,
            "stroke-linejoin": "round",
            "stroke-linecap": "round" if item.width > 1 and not dash else None,
        },
        item.note,
    )


def _mark(item: Mark, palette: Palette, key: str):
    colour, half = palette(item.role), item.size / 2
    x, y = item.x, item.y
    if item.shape in ("circle", "ring"):
        look = {"fill": colour} if item.shape == "circle" else {"fill": palette("ground"), "stroke": colour, "stroke-width": "1.6"}
        yield _element("circle", {"cx": _n(x), "cy": _n(y), "r": _n(half), **look}, item.note)
    elif item.shape in STROKES:
        path = "".join(f"M{_n(x + a * half)},{_n(y + b * half)}L{_n(x + c * half)},{_n(y + d * half)}" for a, b, c, d in STROKES[item.shape])
        yield _element("path", {"d": path, "stroke": colour, "stroke-width": "1.8", "stroke-linecap": "round", "fill": "none"}, item.note)
    else:
        corners = [(x + a * half, y + b * half) for a, b in CORNERS[item.shape]]
        yield _element("polygon", {"points": _points(corners), "fill": colour}, item.note)


def _class(item: Cloud | Text) -> str | None:
    return f"hp-{item.layer}" if item.layer else None


def _cloud(item: Cloud, palette: Palette, key: str):
    # Dots as strokes without length: one element for all of them.
    if item.points:
        path = "".join(f"M{_n(x)},{_n(y)}h0" for x, y in item.points)
        yield _element(
            "path",
            {
                "d": path, "stroke": palette(item.role), "stroke-width": _n(item.size), "stroke-linecap": "round",
                "stroke-opacity": _n(item.strength), "fill": "none", "class": _class(item),
            },
        )  # fmt: skip


def _text(item: Text, palette: Palette, key: str):
    attributes: dict[str, str | None] = {
        "x": _n(item.x),
        "y": _n(item.y),
        "font-size": _n(item.size),
        "text-anchor": item.anchor if item.anchor != "start" else None,
        "font-weight": "600" if item.bold else None,
        "class": _class(item),
    }
    content = escape(item.text)
    if item.halo:
        # A second element beneath, not paint-order: converters to PDF know only this.
        around = {"fill": "none", "stroke": palette("ground"), "stroke-width": "3", "stroke-linejoin": "round", "aria-hidden": "true"}
        yield _element("text", {**attributes, **around}, content=content)
    yield _element("text", {**attributes, "fill": palette(item.role)}, item.note, content)


_DRAWN = {Bar: _bar, Polygon: _polygon, Arrow: _arrow, Line: _line, Mark: _mark, Cloud: _cloud, Text: _text}

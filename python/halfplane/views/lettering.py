# SPDX-License-Identifier: GPL-3.0-or-later
"""
How much room text takes, and where labels go that would lie on one another.

Widths are those of DejaVu Sans, the widest of the fonts that a system's sans-serif is likely to be, so that what is
apart here is apart in any of them. The table: advance widths in thousandths of the size, printed by

    from matplotlib import font_manager, ft2font
    font = ft2font.FT2Font(font_manager.findfont("DejaVu Sans"))
    font.load_char(ord(c), flags=ft2font.LOAD_NO_SCALE).horiAdvance / 2.048
"""

from __future__ import annotations

from .drawing import Drawing, Text

_WIDTHS = {
    278: "ijl", 275: "'", 295: "IJ", 318: " ,.·\u202f", 337: "/:;\\|", 352: "f", 361: "-", 390: "()[]", 392: "t", 401: "!⁰¹²³⁴⁵⁶⁷⁸⁹₀",
    411: "r", 460: '"', 500: "*_`°–", 521: "s", 525: "z", 528: "⁻", 531: "?", 550: "c", 557: "L", 575: "F", 579: "k", 592: "vxy",
    603: "P", 612: "aoeTY", 635: "bdghnpqu$0123456789{}ESµ", 656: "K", 685: "ABVXZ", 698: "CR", 732: "U", 750: "NH", 775: "DG&",
    787: "OQ", 818: "w", 838: "#+<=>^~−±≤≥≈×→", 863: "M", 950: "%", 974: "m", 989: "W", 1000: "@…",
}  # fmt: skip
_WIDTH = {character: width / 1000 for width, characters in _WIDTHS.items() for character in characters}
_OTHER = 0.84
_BOLD = 1.13


def width(text: str, size: float = 12.0, bold: bool = False) -> float:
    """Room that a line of text takes, in the units of a drawing; never less than what it takes on screen."""
    return size * sum(_WIDTH.get(character, _OTHER) for character in text) * (_BOLD if bold else 1.0)


def shortened(text: str, room: float, size: float = 12.0, bold: bool = False) -> str:
    """The text, or as much of it as has room, ending in '…'."""
    if width(text, size, bold) <= room:
        return text
    while text and width(text + "…", size, bold) > room:
        text = text[:-1]
    return text.rstrip() + "…" if text else ""


def wrapped(text: str, room: float, size: float = 12.0, bold: bool = False) -> list[str]:
    """The text in lines that have room; a word too long for a line is shortened."""
    lines: list[str] = []
    line = ""
    for word in text.split(" "):
        longer = f"{line} {word}" if line else word
        if width(longer, size, bold) <= room:
            line = longer
            continue
        if line:
            lines.append(line)
        line = shortened(word, room, size, bold)
    return [*lines, line] if line else lines


def spread(centres: list[float], widths: list[float], low: float, high: float, gap: float = 8.0) -> list[float]:
    """
    Centres of labels that stand side by side in the order of `centres` (ascending), each as near its wish as the others
    allow: the least sum of squared moves. Labels fill low … high; where they do not fit, they run over high.
    """
    # In the coordinates c_k − (room needed left of k) the labels must merely not decrease: isotonic regression by
    # pooling neighbours (Ayer et al., Ann. Math. Stat. 26 (1955) 641).
    before, shift = 0.0, []
    for k, each in enumerate(widths):
        before += each / 2 + (widths[k - 1] / 2 + gap if k else 0.0)
        shift.append(before)
    pools: list[list[float]] = []  # [mean, number]
    for centre, moved in zip(centres, shift):
        pools.append([centre - moved, 1])
        while len(pools) > 1 and pools[-2][0] >= pools[-1][0]:
            mean, number = pools.pop()
            other = pools[-1]
            other[0] = (other[0] * other[1] + mean * number) / (other[1] + number)
            other[1] += number
    room = high - low - (sum(widths) + gap * (len(widths) - 1) if widths else 0.0)
    placed = [min(max(mean, low), low + max(0.0, room)) for mean, number in pools for _ in range(int(number))]
    return [at + moved for at, moved in zip(placed, shift)]


def boxes(drawing: Drawing) -> list[tuple[float, float, float, float, str]]:
    """(left, top, right, bottom, text) of every text in a drawing: what a check for overlaps looks at."""
    found = []
    for item in drawing.items:
        if isinstance(item, Text):
            room = width(item.text, item.size, item.bold)
            left = item.x - {"start": 0.0, "middle": room / 2, "end": room}[item.anchor]
            found.append((left, item.y - 0.75 * item.size, left + room, item.y + 0.2 * item.size, item.text))
    return found

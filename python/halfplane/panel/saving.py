# SPDX-License-Identifier: GPL-3.0-or-later
"""What the panel leaves behind: a picture of all views, and reports."""

from __future__ import annotations

import json
from pathlib import Path

from ..views import render
from ..views.board import Board
from ..views.drawing import Drawing

_WIDTH, _GAP = 1200.0, 24.0
_HALF = (_WIDTH - _GAP) / 2
# Rows of (view, width, height).
_ROWS = (
    (("heading", _WIDTH, 92.0),),
    (("ladder", _HALF, 300.0), ("losses", _HALF, 280.0)),
    (("decision_map", _HALF, 560.0), ("curve", _HALF, 560.0)),
    (("history", _WIDTH, 280.0),),
    (("account", _WIDTH, 300.0),),
)


def sheet(board: Board) -> Drawing:
    """All views on one drawing."""
    out = Drawing("sheet", _WIDTH + 2 * _GAP, 0.0, title="The link in all views")
    y, said = _GAP, []
    for row in _ROWS:
        x, lowest = _GAP, y
        for name, width, height in row:
            drawn = board.draw(name, (width, height))
            out.place(drawn, x, y)
            said.append(drawn.description)
            x += width + _GAP
            lowest = max(lowest, y + drawn.height)
        y = lowest + _GAP
    out.height, out.description = y, " ".join(said)
    return out


def picture(board: Board, path: str, theme: str) -> None:
    """As PNG (two pixels a unit) or SVG, by the ending."""
    ending = Path(path).suffix.lower()
    if ending == ".svg":
        Path(path).write_text(render(sheet(board), theme), encoding="utf-8")
    elif ending == ".png":
        from ..views import qt

        if not qt.image(sheet(board), theme).save(path):
            raise OSError(f"{path}: the picture cannot be written")
    else:
        raise ValueError(f"{path}: a picture ends in .png or .svg")


def report(board: Board, path: str, log: str) -> None:
    """
    .json: the latest report with its settings. .html: the acceptance report of `log`; where there is none, of the latest report,
    which is put beside it as a log of its own, so that what the report's digest speaks of can be had.
    """
    latest, settings = board.latest()
    if not latest:
        raise ValueError("there is no report yet")
    target = Path(path)
    if target.suffix.lower() == ".json":
        whole = {**latest, "settings": settings} if settings is not None else latest
        target.write_text(json.dumps(whole, ensure_ascii=False, indent=1) + "\n", encoding="utf-8")
        return
    if target.suffix.lower() != ".html":
        raise ValueError(f"{path}: a report ends in .html or .json")
    from ..acceptance import document, page
    from ..views import source

    if not log:
        log = str(target.with_suffix(".jsonl"))
        Path(log).write_text(_as_log(latest, settings), encoding="utf-8")
    read = source.read([log])
    target.write_text(page.html(document.of_logs(read), read.trace), encoding="utf-8")


def _as_log(latest: dict, settings: dict | None) -> str:
    lines = [latest]
    if settings is not None:
        lines.insert(0, {"schema": "halfplane/settings/1", "settings_sha256": latest.get("settings_sha256", ""), "settings": settings})
    return "".join(json.dumps(line, ensure_ascii=False) + "\n" for line in lines)

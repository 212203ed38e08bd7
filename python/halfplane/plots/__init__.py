# SPDX-License-Identifier: GPL-3.0-or-later
"""Plots of rates and of links. matplotlib is imported by the modules below only, so that everything else starts fast."""

from pathlib import Path

FORMATS = (".svg", ".png", ".pdf")


def check_format(path):
    """ValueError unless the file's ending names a format that is written, and its folder exists."""
    ending = Path(path).suffix.lower()
    if ending not in FORMATS:
        raise ValueError(f"{path}: a plot ends in {', '.join(FORMATS[:-1])} or {FORMATS[-1]}")
    folder = Path(path).resolve().parent
    if not folder.is_dir():
        raise ValueError(f"{path}: there is no folder {folder}")

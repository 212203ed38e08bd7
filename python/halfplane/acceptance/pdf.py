# SPDX-License-Identifier: GPL-3.0-or-later
"""The acceptance report as PDF, by WeasyPrint; the same page gives the same bytes."""

from __future__ import annotations

import contextlib
import os
from pathlib import Path


def write(html: str, path: str | Path) -> None:
    """ValueError says what to install where WeasyPrint is missing."""
    try:
        import weasyprint
    except ImportError:
        raise ValueError("PDF takes WeasyPrint (Debian: weasyprint); an .html prints from any browser") from None
    with _no_clock():
        made = weasyprint.HTML(string=html).write_pdf()
    Path(path).write_bytes(made)


@contextlib.contextmanager
def _no_clock():
    """The fonts that are put into the file would carry the time of writing."""
    before = os.environ.get("SOURCE_DATE_EPOCH")
    os.environ["SOURCE_DATE_EPOCH"] = "0"
    try:
        yield
    finally:
        if before is None:
            del os.environ["SOURCE_DATE_EPOCH"]
        else:
            os.environ["SOURCE_DATE_EPOCH"] = before

# SPDX-License-Identifier: GPL-3.0-or-later
"""The files of link_log that the page offers: the one that is written, and those put aside as PATH.1, PATH.2 …"""

from __future__ import annotations

import os
import re
import stat
from pathlib import Path
from typing import BinaryIO

_NUMBER = re.compile(r"[1-9][0-9]{0,8}")


class Logs:
    """
    Nothing a client says becomes part of a file's name but a number of digits alone. path: of the log, "" for none.
    """

    def __init__(self, path: str):
        self._path = path

    def __bool__(self) -> bool:
        return bool(self._path)

    def found(self) -> list[dict]:
        """As {"path": of the page, "file", "bytes"}: those put aside in the order of their numbers, then the one that is written."""
        if not self._path:
            return []
        log = Path(self._path)
        numbers = sorted(int(each.name[len(log.name) + 1 :]) for each in log.parent.glob("*") if _is_aside(each.name, log.name))
        rows = [{"path": f"log/{number}", "file": f"{log.name}.{number}", "bytes": _size(f"{log}.{number}")} for number in numbers]
        return [row for row in [*rows, {"path": "log", "file": log.name, "bytes": _size(str(log))}] if row["bytes"] is not None]

    def open(self, number: str | None) -> tuple[BinaryIO, str] | None:
        """The log, or the one put aside under this number → (file, its name); None where there is none. OSError where it cannot be read."""
        if not self._path:
            return None
        if number is None:
            return open(self._path, "rb"), Path(self._path).name
        if not _NUMBER.fullmatch(number) or not number.isascii():
            return None
        path = f"{self._path}.{number}"
        try:
            # Neither a link to elsewhere nor a pipe that would wait for a writer.
            file = os.fdopen(os.open(path, os.O_RDONLY | os.O_NOFOLLOW | os.O_NONBLOCK | os.O_CLOEXEC), "rb")
        except FileNotFoundError:
            return None
        if not stat.S_ISREG(os.fstat(file.fileno()).st_mode):
            file.close()
            return None
        return file, Path(path).name


def _is_aside(name: str, log: str) -> bool:
    return name.startswith(log + ".") and name.isascii() and _NUMBER.fullmatch(name[len(log) + 1 :]) is not None


def _size(path: str) -> int | None:
    try:
        found = os.lstat(path)
    except OSError:
        return None
    return found.st_size if stat.S_ISREG(found.st_mode) else None

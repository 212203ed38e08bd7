# SPDX-License-Identifier: GPL-3.0-or-later
"""
Following a link from outside its flowgraph: a growing log, also across its rotation, or the page of a running link.

Both give their news when asked (`poll`), so that whoever shows them keeps the clock.
"""

from __future__ import annotations

import json
import os
import urllib.error
import urllib.parse
import urllib.request
from collections.abc import Iterator

from .views import source

_PIECE = 1 << 20
_LARGEST_REPORT = 64 << 20


class LogTail:
    """
    The reports of a log, those that stand in it and then those that are added. A file put aside under another name is read
    to its end before the new one is taken up; one that became shorter is read from its start. Half a line waits for its rest.
    """

    def __init__(self, path: str):
        self.name = str(path)
        self._path = path
        self._file = open(path, "rb")  # noqa: SIM115
        self._start()

    def _start(self) -> None:
        self._reader = source.Reader(self.name)
        self._rest = b""

    def poll(self) -> Iterator[source.Record]:
        """New reports, none where nothing was added. Raises source.LogError for a line that is no report."""
        yield from self._read()
        if self._was_replaced():
            yield from self._read()  # what was written until it was put aside
            self._file.close()
            self._file = open(self._path, "rb")  # noqa: SIM115
            self._start()
            yield from self._read()

    def close(self) -> None:
        self._file.close()

    def _was_replaced(self) -> bool:
        try:
            now = os.stat(self._path)
        except FileNotFoundError:  # put aside, the new one is not there yet
            return False
        mine = os.fstat(self._file.fileno())
        return (now.st_dev, now.st_ino) != (mine.st_dev, mine.st_ino) or mine.st_size < self._file.tell()

    def _read(self) -> Iterator[source.Record]:
        while piece := self._file.read(_PIECE):
            lines = (self._rest + piece).split(b"\n")
            self._rest = lines.pop()
            for line in lines:
                try:
                    record = self._reader.take(line.decode("utf-8", errors="replace"))
                except source.Torn:  # a writer that was stopped and went on
                    continue
                if record is not None:
                    yield record


class PagePoll:
    """The latest report of a page (link_page), asked for anew each time. token: where the page demands one."""

    def __init__(self, url: str, token: str = "", seconds: float = 5.0):
        parts = urllib.parse.urlsplit(url)
        if parts.scheme not in ("http", "https") or not parts.hostname:
            raise ValueError(f"{url}: a page's address is http://HOST:PORT/")
        query = dict(urllib.parse.parse_qsl(parts.query))
        self._token = token or query.pop("token", "")
        self.name = urllib.parse.urlunsplit((parts.scheme, parts.netloc, "", "", ""))
        self._seconds = seconds
        self._seen: tuple = ()

    def poll(self) -> Iterator[source.Record]:
        """The latest report where it is a new one. ConnectionError says why there is no answer."""
        request = urllib.request.Request(self.name + "/report")
        if self._token:
            request.add_header("Authorization", f"Bearer {self._token}")
        try:
            with urllib.request.urlopen(request, timeout=self._seconds) as answer:
                body = answer.read(_LARGEST_REPORT)
        except urllib.error.HTTPError as error:
            if error.code == 404:  # no report yet
                return
            said = " (a token is wanted: --token)" if error.code in (401, 403) else ""
            raise ConnectionError(f"{self.name}: answered {error.code}{said}") from None
        except (OSError, ValueError) as error:
            raise ConnectionError(f"{self.name}: {getattr(error, 'reason', None) or error}") from None
        try:
            settings, report = source.of_message(json.loads(body))
        except (json.JSONDecodeError, AttributeError, UnicodeDecodeError):
            raise ConnectionError(f"{self.name}: what it answers is no report") from None
        seen = (report.get("sequence"), report.get("time"), report.get("total", {}).get("in"))
        if seen != self._seen:
            self._seen = seen
            yield source.Record(report, settings, 0)

    def close(self) -> None:
        pass


def follow(what: str, token: str = "") -> LogTail | PagePoll:
    """LOG or URL, whichever it is."""
    return PagePoll(what, token) if "://" in what else LogTail(what)

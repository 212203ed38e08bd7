# SPDX-License-Identifier: GPL-3.0-or-later
"""What a live view keeps of a link: the latest report, the settings it was made under, the history. Safe from any thread."""

from __future__ import annotations

import threading

from . import glance
from .drawing import Drawing
from .history import history as draw_history
from .trace import Trace


class Board:
    """Takes reports and draws views of what it holds. Memory does not grow with the number of reports."""

    def __init__(self) -> None:
        self._lock = threading.Lock()
        self._report: dict = {}
        self._settings: dict | None = None
        self._cloud: tuple = ()
        self._digest: str | None = None
        self._trace = Trace()
        self._taken = 0

    def put(self, report: dict) -> None:
        """
        A report, with the `settings` and the `cloud` (recent samples) that travel with it or without. Settings stay known as long as the reports name the
        same digest. Raises TypeError or ValueError on what is no report and then keeps what it had.
        """
        if not isinstance(report, dict) or not isinstance(report.get("total", {}), dict):
            raise ValueError("a report is wanted, an object with counts under `total`")
        report = dict(report)
        settings, digest = report.pop("settings", None), report.get("settings_sha256")
        cloud = tuple(map(complex, report.pop("cloud", ())))
        with self._lock:
            self._trace.add(report)
            if settings is not None:
                self._settings = settings
            elif digest != self._digest:
                self._settings = None
            self._digest = digest
            self._cloud = cloud
            self._report = report
            self._taken += 1

    @property
    def taken(self) -> int:
        """Reports taken so far."""
        return self._taken

    def latest(self) -> tuple[dict, dict | None]:
        """The latest report, {} before the first, and its settings, None where not known. Not to be changed."""
        with self._lock:
            return self._report, self._settings

    def answers(self) -> tuple[glance.Answer, ...]:
        return glance.answers(self.latest()[0])

    def draw(self, view: str, size: tuple[float, float], labels: bool = False, samples: bool = True) -> Drawing:
        """A view of what is held, by its name in VIEWS. labels, samples: whether the decision map shows them."""
        from . import VIEWS

        report, settings = self.latest()
        if view == "history":
            with self._lock:
                return draw_history(self._trace, settings, size)
        if view == "decision_map":
            return VIEWS[view](report, settings, size, labels, self._cloud if samples else None)
        return VIEWS[view]([report] if view == "curve" else report, settings, size)

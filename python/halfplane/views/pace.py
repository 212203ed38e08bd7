# SPDX-License-Identifier: GPL-3.0-or-later
"""When to draw which view of a live link: what is new, not too often, and never for more than a share of one core."""

from __future__ import annotations

# Seconds between two drawings of a view at the least: what a reader follows, what is read now and then, what takes long to
# draw and changes little.
QUICK, STEADY, SLOW = 0.25, 0.5, 1.0
INTERVALS = {"account": STEADY, "losses": STEADY, "decision_map": SLOW, "curve": SLOW, "history": SLOW}


class Pace:
    """
    Reports come faster than anyone reads. `due` names the view whose turn it is, `spent` says what drawing it took; over time
    the drawings take at most `share` of one core, whatever the machine and the set: on a slow one they come less often.

    Times are in seconds of a clock of the caller's that never goes back. Not for several threads at once.
    """

    def __init__(self, views, share: float = 0.04, saved: float = 0.1):
        if not 0 < share <= 1:
            raise ValueError(f"share is {share}: a number in (0, 1] is wanted")
        self._views = list(views)
        self._share = share
        self._most = saved  # seconds of drawing that may be saved up: the first pictures come at once
        self._credit = saved
        self._counted_until: float | None = None
        self._drawn = dict.fromkeys(self._views, float("-inf"))
        self._fresh = dict.fromkeys(self._views, False)

    def renew(self, *views: str) -> None:
        """There is something new to draw, in these views or in all."""
        for view in views or self._views:
            self._fresh[view] = True

    def due(self, now: float) -> str | None:
        """The view to be drawn now: among those that are new and rested, the one that waited longest. None: none."""
        self._earn(now)
        if self._credit <= 0:
            return None
        ready = [view for view in self._views if self._fresh[view] and now >= self._ready_at(view)]
        return min(ready, key=self._drawn.__getitem__, default=None)

    def wait(self, now: float) -> float | None:
        """Seconds until `due` may name one; None where nothing is new."""
        fresh = [view for view in self._views if self._fresh[view]]
        if not fresh:
            return None
        self._earn(now)
        rested = min(map(self._ready_at, fresh)) - now
        earned = -self._credit / self._share if self._credit <= 0 else 0.0
        return max(0.0, rested, earned + 1e-3 if self._credit <= 0 else 0.0)

    def spent(self, view: str, seconds: float, now: float) -> None:
        """The view was drawn now and took so many seconds of a core."""
        self._fresh[view] = False
        self._drawn[view] = now
        self.charge(seconds)

    def charge(self, seconds: float) -> None:
        """Work besides, which counts as drawing."""
        self._credit -= seconds

    def _ready_at(self, view: str) -> float:
        return self._drawn[view] + INTERVALS.get(view, QUICK)

    def _earn(self, now: float) -> None:
        if self._counted_until is not None:
            self._credit = min(self._most, self._credit + self._share * max(0.0, now - self._counted_until))
        self._counted_until = now

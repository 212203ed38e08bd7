# SPDX-License-Identifier: GPL-3.0-or-later
"""What a history keeps of a run: a bounded number of spans, thinned by merging neighbours, so that memory stays flat."""

from __future__ import annotations

from dataclasses import dataclass, field

_WORSE = {"held": 0, "doubtful": 1, "searching": 2, "lost": 3}


@dataclass
class Span:
    """
    From one report to the next; x in seconds, or in symbols where the symbol rate is not known. falls: by place the latest
    (dB, low, high), ends None where not known. events: by cause, symbols left out within the span. run: which run of a log.
    """

    start: float
    end: float
    run: int
    falls: dict[str, tuple[float, float | None, float | None]] = field(default_factory=dict)
    lock: str | None = None
    slips: int = 0
    events: dict[str, int] = field(default_factory=dict)

    def merge(self, later: Span) -> None:
        """Takes in the span that follows: what adds up is added, the worse lock stays, the later shortfall stands."""
        self.end = later.end
        self.falls = later.falls or self.falls
        if later.lock is not None and (self.lock is None or _WORSE.get(later.lock, 0) > _WORSE.get(self.lock, 0)):
            self.lock = later.lock
        self.slips += later.slips
        for cause, number in later.events.items():
            self.events[cause] = self.events.get(cause, 0) + number


class Trace:
    """Takes reports in their order; keeps at most `most` spans. A report whose sequence starts again begins a new run."""

    def __init__(self, reports=(), most: int = 600):
        if most < 4:
            raise ValueError(f"a trace keeps at least 4 spans, got {most}")
        self.most = most
        self.spans: list[Span] = []
        self.in_seconds: bool | None = None
        self.reports = 0
        self._run, self._offset = 0, 0.0
        self._last: tuple[float, int | None, int, dict[str, int]] = (0.0, None, 0, {})  # x, sequence, slips, excluded
        for report in reports:
            self.add(report)

    def add(self, report: dict) -> None:
        """Adds a report's step since the one before."""
        total = report.get("total")
        if not total:
            return
        if self.in_seconds is None:
            self.in_seconds = "seconds" in total
        at = float(total.get("seconds", 0.0) if self.in_seconds else total.get("in", 0))
        before, sequence, slips, excluded = self._last
        number = report.get("sequence")
        if self.reports and (at < before or (number is not None and sequence is not None and number <= sequence)):
            self._run += 1
            self._offset += before
            before, slips, excluded = 0.0, 0, {}
        span = Span(self._offset + before, self._offset + at, self._run, lock=report.get("lock", {}).get("state"))
        for place, fall in report.get("shortfall", {}).items():
            if "db" in fall:
                span.falls[place] = (fall["db"], fall.get("db_low"), fall.get("db_high"))
        now = total.get("excluded", {})
        span.slips = total.get("slips", 0) - slips
        span.events = {cause: count - excluded.get(cause, 0) for cause, count in now.items() if count > excluded.get(cause, 0)}
        self._last = (at, number, total.get("slips", 0), dict(now))
        self.reports += 1
        self.spans.append(span)
        if len(self.spans) > self.most:
            self._thin()

    def _thin(self) -> None:
        """
        Merges the two neighbours of one run that together cover least, so that all spans grow alike; the latest eighth
        keeps its detail.
        """
        spans = self.spans
        best, least = None, float("inf")
        for k in range(len(spans) - max(2, self.most // 8)):
            first, second = spans[k], spans[k + 1]
            if second.run == first.run and second.end - first.start < least:
                best, least = k, second.end - first.start
        if best is None:  # every span a run of its own: the oldest goes
            del spans[0]
        else:
            spans[best].merge(spans.pop(best + 1))

# SPDX-License-Identifier: GPL-3.0-or-later
"""The live part of the page: views drawn once for all clients, and for each client what it has not read yet."""

from __future__ import annotations

import asyncio
import json
import logging
import time

from .. import views
from ..views.board import Board
from ..views.pace import Pace

# Room for a drawing on the page, in CSS pixels at 100 %, by the layout that a client asks for.
LAYOUTS = {
    "narrow": {"ladder": (328, 300), "decision_map": (328, 380), "losses": (328, 240), "history": (328, 250), "curve": (328, 330), "account": (328, 300)},
    "wide": {"ladder": (480, 300), "decision_map": (480, 450), "losses": (480, 260), "history": (480, 280), "curve": (480, 350), "account": (480, 300)},
}  # fmt: skip
NAMES = tuple(LAYOUTS["wide"])
SUMMARY = "summary"  # the event with the three answers
_SUMMARY_SECONDS = 0.1


def event(name: str, data: str) -> bytes:
    """One server-sent event, as the HTML standard has it: a line of `data:` for each line."""
    lines = "".join(f"data: {line}\n" for line in data.splitlines())
    return f"event: {name}\n{lines}\n".encode()


class Client:
    """
    What one live page has still to read: of each view the newest only. So a client that reads slowly, or not at all, costs
    one reference a view; what it missed is dropped, the oldest first.
    """

    def __init__(self, layout: str):
        self.layout = layout
        self._waiting: dict[str, bytes] = {}
        self._news = asyncio.Event()

    def give(self, name: str, data: bytes) -> None:
        self._waiting.pop(name, None)  # the newer one stands at the end
        self._waiting[name] = data
        self._news.set()

    async def take(self) -> bytes:
        """Everything that waits, once something does."""
        await self._news.wait()
        found = b"".join(self._waiting.values())
        self._waiting.clear()
        self._news.clear()
        return found


class Studio:
    """
    Draws each view once a layout that somebody looks at, no faster than `Pace` allows, and gives it to all clients. Lives in
    the loop's thread; so do all its calls.
    """

    def __init__(self, board: Board, log: logging.Logger, share: float, offers_log: bool):
        self._board, self._log, self._share, self._offers_log = board, log, share, offers_log
        self._clients: set[Client] = set()
        self._paces: dict[str, Pace] = {}
        self._latest: dict[str, dict[str, bytes]] = {layout: {} for layout in LAYOUTS}
        self._summary: bytes | None = None
        self._new_report = False
        self._woken = asyncio.Event()
        self._failed: set[str] = set()

    def __len__(self) -> int:
        return len(self._clients)

    def enter(self, client: Client) -> None:
        """A client that comes gets what is there, and fresh pictures as soon as may be."""
        if not any(each.layout == client.layout for each in self._clients):
            self._paces.setdefault(client.layout, Pace(NAMES, self._share / len(LAYOUTS))).renew()
        self._clients.add(client)
        if self._summary is not None:
            client.give(SUMMARY, self._summary)
        for name, data in self._latest[client.layout].items():
            client.give(name, data)
        self._new_report |= self._summary is None and self._board.taken > 0
        self._woken.set()

    def leave(self, client: Client) -> None:
        self._clients.discard(client)

    def wake(self) -> None:
        """A report came."""
        self._new_report = True
        for pace in self._paces.values():
            pace.renew()
        self._woken.set()

    async def run(self) -> None:
        """Draws until cancelled."""
        summary_at = float("-inf")
        while True:
            self._woken.clear()
            now = time.monotonic()
            if self._new_report and self._clients and now - summary_at >= _SUMMARY_SECONDS:
                self._summarise()
                summary_at = now
            waits = [self._draw_for(layout) for layout in {client.layout for client in self._clients}]
            if self._new_report and self._clients:
                waits.append(max(0.0, summary_at + _SUMMARY_SECONDS - now))
            pending = [wait for wait in waits if wait is not None]
            try:
                # Never without a pause: requests are answered in between.
                await asyncio.wait_for(self._woken.wait(), max(0.005, min(pending)) if pending else None)
                await asyncio.sleep(0)
            except asyncio.TimeoutError:
                pass

    def _draw_for(self, layout: str) -> float | None:
        """Draws at most one view → seconds until there is more to do, None where nothing is new."""
        pace = self._paces[layout]
        name = pace.due(time.monotonic())
        if name is not None:
            began = time.thread_time()
            data = self._drawn(name, layout)
            pace.spent(name, time.thread_time() - began, time.monotonic())
            if data is not None and self._latest[layout].get(name) != data:
                self._latest[layout][name] = data
                self._give(name, data, layout)
        return pace.wait(time.monotonic())

    def _drawn(self, name: str, layout: str) -> bytes | None:
        try:
            return event(name, views.render(self._board.draw(name, LAYOUTS[layout][name], labels=True), "page"))
        except Exception:  # whatever a report may hold, the others are drawn
            if name not in self._failed:
                self._failed.add(name)
                self._log.exception("the view %s cannot be drawn of this report; said once", name)
            return None

    def _summarise(self) -> None:
        self._new_report = False
        report, _ = self._board.latest()
        try:
            answers = [vars(answer) for answer in views.answers(report)]
        except Exception:
            self._log.exception("the report cannot be summed up")
            return
        said: dict = {key: report[key] for key in ("set", "pattern", "time", "sequence", "final") if key in report}
        self._summary = event(SUMMARY, json.dumps({**said, "log": self._offers_log, "answers": answers}))
        self._give(SUMMARY, self._summary)

    def _give(self, name: str, data: bytes, layout: str | None = None) -> None:
        for client in self._clients:
            if layout in (None, client.layout):
                client.give(name, data)

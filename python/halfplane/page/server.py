# SPDX-License-Identifier: GPL-3.0-or-later
"""
The HTTP server of the page, on a thread and an event loop of its own.

| path | what |
|---|---|
| `/` | the page; `/page.css`, `/page.js`, `/icon.svg`, `/roles.css` are its files and say nothing of the link |
| `/events` | server-sent events: the three answers, and each view as SVG (`?layout=wide` or `narrow`) |
| `/report` | the latest report as JSON; 404 before the first |
| `/metrics` | the same as OpenMetrics text |
| `/log` | the file of `link_log` as a download; 404 where none was named |
| `/logs` | the logs there are, as JSON: that one, and those put aside when they had grown long |
| `/log/1` … | those put aside, as downloads |
"""

from __future__ import annotations

import asyncio
import contextlib
import logging
import os
import socket
import threading
from pathlib import Path

from aiohttp import web

from ..views import themes
from ..views.board import Board
from . import limits
from .gate import Gates
from .guard import HEADERS, OWN_ADDRESS, Guard, plain
from .logs import Logs
from .metrics import CONTENT_TYPE, Collector
from .stream import LAYOUTS, Client, Studio

_HERE = Path(__file__).parent
_FILES = {"/page.css": "text/css", "/page.js": "text/javascript", "/icon.svg": "image/svg+xml"}


class Server:
    """
    Construction reserves the port, so that one in use is an error there and then; start() begins to answer, stop() ends every
    connection, gives the port back and joins the thread. After stop() it can be started again. publish() takes reports from
    any thread and never waits for a client.

    port: 0 for one that is free (see `port` afterwards). address, token, names: see guard.Guard. log: path of the file of
    link_log, "" for none. share: of one core, the most that drawing may take.
    head_seconds: how long a request may take to arrive.

    Raises ValueError on what is not fit, OSError where the port cannot be had.
    """

    def __init__(
        self, port: int = 8321, address: str = OWN_ADDRESS, token: str = "", log: str = "", names: tuple[str, ...] = (),
        share: float = 0.05, head_seconds: float = limits.HEAD_SECONDS,
    ):  # fmt: skip
        if not 0 <= port <= 65535:
            raise ValueError(f"port is {port}: 0 to 65535 is wanted")
        self._guard = Guard(address, token, names)
        self._address, self._asked, self._logs = address, port, Logs(log)
        self._share, self._head_seconds = share, head_seconds
        self._log = logging.getLogger("halfplane.page")
        self._board = Board()
        self._metrics = Collector(lambda: (self._board.latest()[0], self._board.taken), lambda: self._streams)
        self._streams = 0
        self._files = {path: (_HERE / path[1:]).read_bytes() for path in _FILES}
        self._files["/roles.css"] = themes.stylesheet().encode()
        self._page = (_HERE / "page.html").read_bytes()
        self._routes = {"/": self._front, "/events": self._events, "/report": self._report, "/metrics": self._openmetrics, "/log": self._download, "/logs": self._list_logs}
        self._thread: threading.Thread | None = None
        self._loop: asyncio.AbstractEventLoop | None = None
        self._end: asyncio.Event | None = None
        self._woken = threading.Event()  # a wake-up of the loop is under way
        self._socket: socket.socket | None = self._reserve()
        self.port: int = self._socket.getsockname()[1]

    @property
    def address(self) -> str:
        return self._address

    @property
    def url(self) -> str:
        """Where a browser on this machine finds it; the token is not in it."""
        host = OWN_ADDRESS if self._address == "0.0.0.0" else "::1" if self._address == "::" else self._address
        return f"http://[{host}]:{self.port}/" if ":" in host else f"http://{host}:{self.port}/"

    def publish(self, report: dict) -> None:
        """Shows this report from now on. ValueError where it is none."""
        self._board.put(report)
        self._metrics.reported(self._board.taken)
        loop = self._loop
        if loop is not None and not self._woken.is_set():
            self._woken.set()
            try:
                loop.call_soon_threadsafe(self._wake)
            except RuntimeError:  # it ends just now
                self._woken.clear()

    def start(self) -> None:
        """OSError where the port was given back and another has taken it since."""
        if self._thread is not None:
            return
        if self._socket is None:
            self._socket = self._reserve()
        running = threading.Event()
        self._thread = threading.Thread(target=self._serve, args=(self._socket, running), name="halfplane page", daemon=True)
        self._thread.start()
        running.wait()

    def stop(self) -> None:
        """Returns when nothing of it runs any more and the port is free."""
        thread, loop, end = self._thread, self._loop, self._end
        if thread is not None:
            if loop is not None and end is not None:
                try:
                    loop.call_soon_threadsafe(end.set)
                except RuntimeError:
                    pass  # it has ended by itself
            thread.join()
            self._thread = None
        if self._socket is not None:
            self._socket.close()
            self._socket = None

    def _reserve(self) -> socket.socket:
        family = socket.AF_INET6 if ":" in self._address else socket.AF_INET
        found = socket.socket(family, socket.SOCK_STREAM)
        try:
            found.setsockopt(socket.SOL_SOCKET, socket.SO_REUSEADDR, 1)
            found.bind((self._address, getattr(self, "port", self._asked)))
            found.listen(128)
        except OSError as error:
            found.close()
            raise OSError(error.errno, f"port {self._asked} on {self._address} cannot be had: {error.strerror}") from None
        found.setblocking(False)
        return found

    def _serve(self, listening: socket.socket, running: threading.Event) -> None:
        try:
            asyncio.run(self._main(listening, running))
        except Exception:
            self._log.exception("the page ended")
        finally:
            self._loop = self._end = None
            listening.close()
            self._socket = None
            running.set()

    async def _main(self, listening: socket.socket, running: threading.Event) -> None:
        self._end = asyncio.Event()
        self._studio = Studio(self._board, self._log, self._share, bool(self._logs))
        inner = web.Server(
            self._answer, access_log=None, logger=_of_malformed_requests(), max_line_size=limits.LINE, max_field_size=limits.FIELD,
            lingering_time=0.0, tcp_keepalive=True,
        )  # fmt: skip
        self._gates = Gates(inner, self._head_seconds)
        loop = asyncio.get_running_loop()
        server = await loop.create_server(self._gates, sock=listening)
        drawing = loop.create_task(self._studio.run())
        self._loop = loop
        self._woken.clear()
        running.set()
        try:
            await self._end.wait()
        finally:
            self._loop = None
            server.close()
            drawing.cancel()
            self._gates.close()
            await inner.shutdown(1.0)

    def _wake(self) -> None:
        self._woken.clear()
        self._studio.wake()

    async def _answer(self, request: web.BaseRequest) -> web.StreamResponse:
        gate = self._gates.of(request.transport)
        if gate is not None:
            gate.arrived(limits.ANSWER_SECONDS)
        try:
            answer = self._guard.refusal(request)
            if answer is None:
                answer = await self._routed(request, gate)
        except Exception:
            self._log.exception("%s %s cannot be answered", request.method, request.path)
            answer = plain(500, "This cannot be answered; the flowgraph's log says why.")
        answer.force_close()
        return answer

    async def _routed(self, request: web.BaseRequest, gate) -> web.StreamResponse:
        if request.path in self._files:
            kind = _FILES.get(request.path, "text/css")
            return web.Response(body=self._files[request.path], content_type=kind, charset="utf-8", headers=HEADERS)
        unknown = self._guard.unknown(request)
        if unknown is not None:
            return unknown
        route = self._download if request.path.startswith("/log/") else self._routes.get(request.path)
        return await route(request, gate) if route else plain(404, "There is nothing here.")

    async def _front(self, request: web.BaseRequest, gate) -> web.Response:
        return web.Response(body=self._page, content_type="text/html", charset="utf-8", headers=HEADERS)

    async def _report(self, request: web.BaseRequest, gate) -> web.Response:
        report, settings = self._board.latest()
        if not report:
            return plain(404, "No report yet.")
        whole = {**report, "settings": settings} if settings is not None else report
        return web.json_response(whole, headers=HEADERS)

    async def _openmetrics(self, request: web.BaseRequest, gate) -> web.Response:
        return web.Response(body=self._metrics.text(), headers={**HEADERS, "Content-Type": CONTENT_TYPE})

    async def _list_logs(self, request: web.BaseRequest, gate) -> web.Response:
        return web.json_response(self._logs.found(), headers=HEADERS)

    async def _download(self, request: web.BaseRequest, gate) -> web.StreamResponse:
        if not self._logs:
            return plain(404, "No log is offered here: link_page was given no path.")
        try:
            opened = self._logs.open(None if request.path == "/log" else request.path.removeprefix("/log/"))
        except OSError as error:
            self._log.error("the log cannot be read: %s", error)
            return plain(404, "The log cannot be read.")
        if opened is None:
            return plain(404, "There is no log of this number.")
        file, name = opened
        with file:
            size = os.fstat(file.fileno()).st_size
            name = name.encode("ascii", "replace").decode().replace('"', "_").replace("\\", "_")
            answer = web.StreamResponse(headers={**HEADERS, "Content-Type": "application/x-ndjson", "Content-Disposition": f'attachment; filename="{name}"'})
            answer.content_length = size  # what is written meanwhile belongs to the next download
            answer.force_close()
            await answer.prepare(request)
            if request.method == "HEAD":
                return answer
            if gate is not None:
                gate.arrived(None)
            with contextlib.suppress(ConnectionError):  # it went away
                while size > 0 and (piece := file.read(min(limits.PIECE, size))):
                    await self._write(request, answer, piece)
                    size -= len(piece)
        return answer

    async def _events(self, request: web.BaseRequest, gate) -> web.StreamResponse:
        layout = request.query.get("layout", "wide")
        if layout not in LAYOUTS:
            return plain(400, "layout is wide or narrow.")
        if self._streams >= limits.STREAMS:
            return plain(503, "As many live pages as may be are open.", **{"Retry-After": "10"})
        answer = web.StreamResponse(headers={**HEADERS, "Content-Type": "text/event-stream; charset=utf-8"})
        answer.force_close()
        await answer.prepare(request)
        if request.method == "HEAD":
            return answer
        if gate is not None:
            gate.arrived(None)
        client = Client(layout)
        self._streams += 1
        try:
            await self._write(request, answer, b"retry: 2000\n\n")
            self._studio.enter(client)
            while request.transport is not None:
                try:
                    news = await asyncio.wait_for(client.take(), limits.BEAT_SECONDS)
                except asyncio.TimeoutError:
                    news = b": still here\n\n"
                await self._write(request, answer, news)
        except ConnectionError:
            pass  # it went away
        finally:
            self._streams -= 1
            self._studio.leave(client)
        return answer

    async def _write(self, request: web.BaseRequest, answer: web.StreamResponse, piece: bytes) -> None:
        """A client that does not take it in time is cut off."""
        try:
            await asyncio.wait_for(answer.write(piece), limits.WRITE_SECONDS)
        except asyncio.TimeoutError:
            if request.transport is not None:
                request.transport.abort()
            raise ConnectionResetError("a client did not read") from None


def _of_malformed_requests() -> logging.Logger:
    """aiohttp's log, without a traceback for every request that makes no sense: anyone could fill a disk with them."""
    log = logging.getLogger("halfplane.page.http")
    log.addFilter(_is_our_fault)
    return log


def _is_our_fault(record: logging.LogRecord) -> bool:
    error = record.exc_info[1] if record.exc_info else None
    return not (isinstance(error, ConnectionError) or type(error).__module__.startswith("aiohttp"))

# SPDX-License-Identifier: GPL-3.0-or-later
"""A connection before it is a request: how many, how large, how long. aiohttp's own protocol works behind it."""

from __future__ import annotations

import asyncio
import socket
from collections.abc import Callable

from . import limits

_TOO_LARGE = b"HTTP/1.1 431 Request Header Fields Too Large\r\nConnection: close\r\nContent-Length: 0\r\n\r\n"
_TOO_MANY = b"HTTP/1.1 503 Service Unavailable\r\nConnection: close\r\nRetry-After: 10\r\nContent-Length: 0\r\n\r\n"


class Gates:
    """All open connections, by transport. Called by the loop as a protocol factory."""

    def __init__(self, inner: Callable[[], asyncio.Protocol], head_seconds: float = limits.HEAD_SECONDS):
        self._inner = inner
        self._head_seconds = head_seconds
        self._open: dict[asyncio.BaseTransport, Gate] = {}

    def __call__(self) -> asyncio.Protocol:
        return Gate(self, self._inner())

    def __len__(self) -> int:
        return len(self._open)

    def of(self, transport: asyncio.BaseTransport | None) -> Gate | None:
        """The gate of a request's connection; None where it is gone already."""
        return self._open.get(transport) if transport is not None else None

    def close(self) -> None:
        """Ends every connection at once."""
        for transport in list(self._open):
            transport.abort()


class Gate(asyncio.Protocol):
    """
    Hands a connection on to the HTTP protocol and cuts it where its request is too large or too slow. One connection carries
    one request: what comes after its head is dropped unread.
    """

    def __init__(self, gates: Gates, inner: asyncio.Protocol):
        self._gates, self._inner = gates, inner
        self._transport: asyncio.Transport | None = None
        self._taken = 0
        self._arrived = self._refused = False
        self._deadline: asyncio.TimerHandle | None = None

    def arrived(self, seconds: float | None) -> None:
        """The request is complete; its answer must be taken within so many seconds (None: whoever answers sees to it)."""
        self._arrived = True
        self._within(seconds)

    def connection_made(self, transport: asyncio.BaseTransport) -> None:
        self._transport = transport
        if len(self._gates._open) >= limits.CONNECTIONS:
            self._refuse(_TOO_MANY)
            return
        transport.get_extra_info("socket").setsockopt(socket.SOL_SOCKET, socket.SO_SNDBUF, limits.UNSENT)
        self._gates._open[transport] = self
        self._within(self._gates._head_seconds)
        self._inner.connection_made(transport)

    def data_received(self, data: bytes) -> None:
        if self._arrived or self._refused:
            return
        self._taken += len(data)
        if self._taken > limits.HEAD:
            self._refuse(_TOO_LARGE)
        else:
            self._inner.data_received(data)

    def eof_received(self) -> bool | None:
        return None if self._refused else self._inner.eof_received()

    def connection_lost(self, error: Exception | None) -> None:
        self._within(None)
        if self._gates._open.pop(self._transport, None) is not None:
            self._inner.connection_lost(error)

    def pause_writing(self) -> None:
        if not self._refused:
            self._inner.pause_writing()

    def resume_writing(self) -> None:
        if not self._refused:
            self._inner.resume_writing()

    def _refuse(self, answer: bytes) -> None:
        self._refused = True
        self._transport.write(answer)
        self._transport.close()
        self._within(1.0)  # whether or not it reads the answer

    def _within(self, seconds: float | None) -> None:
        if self._deadline is not None:
            self._deadline.cancel()
        self._deadline = None
        if seconds is not None:
            self._deadline = asyncio.get_running_loop().call_later(seconds, self._transport.abort)

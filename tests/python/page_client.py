# SPDX-License-Identifier: GPL-3.0-or-later
"""Clients of the page for the tests: whole requests, raw bytes, event streams."""

import http.client
import socket
import time

PATIENCE = 20.0  # seconds after which a test gives up waiting


def get(server, path, method="GET", **headers):
    """(status, headers, body)."""
    connection = http.client.HTTPConnection(server.address, server.port, timeout=PATIENCE)
    try:
        connection.request(method, path, headers={key.replace("_", "-"): value for key, value in headers.items()})
        answer = connection.getresponse()
        return answer.status, answer.headers, answer.read()
    finally:
        connection.close()


def raw(server, data, wait=PATIENCE):
    """All that comes back on sending these bytes, until the server ends the connection; None where it never does."""
    with socket.create_connection((server.address, server.port), timeout=wait) as link:
        received = b""
        try:
            link.sendall(data)
            while piece := link.recv(65536):
                received += piece
        except (ConnectionResetError, BrokenPipeError):
            return received
        except TimeoutError:
            return None
        return received


class Stream:
    """An open /events; next() gives (event, data)."""

    def __init__(self, server, query="layout=wide", room=None):
        self.socket = socket.socket()
        self.socket.settimeout(PATIENCE)
        if room:  # bytes that may wait on this side, unread
            self.socket.setsockopt(socket.SOL_SOCKET, socket.SO_RCVBUF, room)
        self.socket.connect((server.address, server.port))
        self.socket.sendall(f"GET /events?{query} HTTP/1.1\r\nHost: {server.address}\r\n\r\n".encode())
        self.file = self.socket.makefile("rb")
        self.seen = set()
        self.status = int(self.file.readline().split()[1])
        while self.file.readline().strip():
            pass

    def next(self):
        """The next event; comes in chunks, whose sizes stand on lines of their own and are passed over."""
        name, lines = None, []
        end = time.monotonic() + PATIENCE
        while time.monotonic() < end:
            line = self.file.readline()
            if not line:
                raise EOFError("the stream ended")
            text = line.decode().rstrip("\r\n")
            if text.startswith("event: "):
                name = text[7:]
            elif text.startswith("data: "):
                lines.append(text[6:])
            elif not text and name and lines:
                return name, "\n".join(lines)
        raise TimeoutError("no event, but signs of life")

    def until(self, wanted, fits=lambda data: True):
        """The data of the next event of that name that fits; the names of those before it are in `seen`."""
        end = time.monotonic() + PATIENCE
        while time.monotonic() < end:
            name, data = self.next()
            self.seen.add(name)
            if name == wanted and fits(data):
                return data
        raise TimeoutError(f"no {wanted} event")

    def close(self):
        self.file.close()
        self.socket.close()

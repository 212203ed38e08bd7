# SPDX-License-Identifier: GPL-3.0-or-later
"""Whom the page answers: what a request must look like, and the headers of every answer."""

from __future__ import annotations

import hmac
import ipaddress
import re
import socket

from aiohttp import web

# Nothing from outside, no script but the page's own file, not in a frame of another page, not kept, no word to others.
HEADERS = {
    "Content-Security-Policy": (
        "default-src 'none'; script-src 'self'; style-src 'self'; img-src 'self'; connect-src 'self'; "
        "base-uri 'none'; form-action 'none'; frame-ancestors 'none'"
    ),
    "X-Content-Type-Options": "nosniff",
    "Referrer-Policy": "no-referrer",
    "Cross-Origin-Resource-Policy": "same-origin",
    "Cross-Origin-Opener-Policy": "same-origin",
    "Cache-Control": "no-store",
    "Server": "halfplane",
}

OWN_ADDRESS = "127.0.0.1"
_TOKEN = re.compile(r"[A-Za-z0-9._~-]{16,256}")


def plain(status: int, text: str, **headers: str) -> web.Response:
    """A short answer in words; the connection ends with it."""
    return web.Response(status=status, text=text + "\n", headers={**HEADERS, **headers})


class Guard:
    """
    Decides before anything else whether a request is answered.

    - Only GET and HEAD, and no body.
    - `Host` must name an IP address, `localhost`, or a name of this machine or of `names`. A page elsewhere on the web whose
      name was made to point here (DNS rebinding) sends its own name and is refused.
    - With a token: it must come as `Authorization: Bearer TOKEN` or as `?token=TOKEN` (browsers cannot set headers on an event
      stream). It is compared in constant time. The token is sent in the clear and `?token=` stays in the browser's history:
      on a network where others listen put a proxy with TLS, or an SSH tunnel, in front.

    Raises ValueError where address, token or names are not fit.
    """

    def __init__(self, address: str = OWN_ADDRESS, token: str = "", names: tuple[str, ...] = ()):
        try:
            ipaddress.ip_address(address)
        except ValueError:
            raise ValueError(f"address is {address!r}: an IP address is wanted, such as {OWN_ADDRESS} or 0.0.0.0") from None
        if address != OWN_ADDRESS and not token:
            raise ValueError(f"address is {address!r}: others can reach it, so a token is demanded (only {OWN_ADDRESS} goes without)")
        if token and not _TOKEN.fullmatch(token):
            raise ValueError("token is not fit: 16 to 256 letters, digits or . _ ~ - are wanted")
        self._token = token
        self._names = {"localhost", *(name.lower() for name in names)}
        if address != OWN_ADDRESS:
            self._names |= {socket.gethostname().lower(), socket.getfqdn().lower()}

    def refusal(self, request: web.BaseRequest) -> web.Response | None:
        """The answer to a request that is refused; None where it may go on."""
        if request.method not in ("GET", "HEAD"):
            return plain(405, "Only GET and HEAD are answered here.", Allow="GET, HEAD")
        if request.headers.get("Transfer-Encoding") or request.headers.get("Content-Length", "0") != "0":
            return plain(413, "A request with a body is not taken.")
        hosts = request.headers.getall("Host", [])
        if len(hosts) != 1 or not self._is_own(hosts[0]):
            return plain(421, "This is not the host that was asked for. Use the IP address, or give link_page the name.")
        return None

    def unknown(self, request: web.BaseRequest) -> web.Response | None:
        """The answer to a request without the token; None where it has it or none is demanded."""
        if not self._token:
            return None
        scheme, _, given = request.headers.get("Authorization", "").partition(" ")
        if scheme.lower() != "bearer":
            given = request.query.get("token", "")
        if hmac.compare_digest(given.strip().encode(), self._token.encode()):
            return None
        return plain(401, "A token is wanted: ?token=… or Authorization: Bearer …", **{"WWW-Authenticate": 'Bearer realm="link"'})

    def _is_own(self, host: str) -> bool:
        if host.startswith("["):
            name, closed, rest = host[1:].partition("]")
            port = rest[1:] if rest.startswith(":") else rest or ("" if closed else "?")
        else:
            name, _, port = host.partition(":")
        if port and not (port.isascii() and port.isdigit()):
            return False
        try:
            ipaddress.ip_address(name)
            return True
        except ValueError:
            return name.lower().rstrip(".") in self._names

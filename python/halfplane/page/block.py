# SPDX-License-Identifier: GPL-3.0-or-later
"""link_page: the live page of a link as a block of the flowgraph."""

from __future__ import annotations

import json

from gnuradio import gr
import pmt

from .. import blocks_python
from ..views.cloud import with_cloud
from .guard import OWN_ADDRESS
from .server import Server


class link_page(gr.basic_block):  # noqa: N801 (blocks are named as the host names them)
    """
    Message port `report` (in): the reports of link_watch. Serves them to browsers as a live page, to programs at /report
    (JSON) and /metrics (OpenMetrics), while the flowgraph runs.

    port: of TCP; one in use raises RuntimeError when the block is made. address: 127.0.0.1 lets in who works on this machine.
    Any other address lets in the network, so it demands a token (16 to 256 letters, digits or . _ ~ -), which every client
    gives as ?token=… or `Authorization: Bearer …`. It travels in the clear: on a network where others may listen put a proxy
    with TLS or an SSH tunnel in front. log: path of link_log's file, offered as a download; "" offers none. names: further
    host names, separated by spaces, under which browsers reach the page; any other name is refused.

    What goes wrong in the page is logged and leaves the flowgraph running.
    Raises ValueError where a parameter is not fit, naming it.
    """

    def __init__(self, port: int = 8321, address: str = OWN_ADDRESS, token: str = "", log: str = "", names: str = ""):
        gr.basic_block.__init__(self, name="link_page", in_sig=None, out_sig=None)
        try:
            self._server = Server(port, address, token, log, tuple(names.split()))
        except ValueError as error:
            raise ValueError(f"link_page: {error}") from None
        except OSError as error:
            raise RuntimeError(f"link_page: {error.strerror}") from None
        report = pmt.intern("report")
        self.message_port_register_in(report)
        self.set_msg_handler(report, self._take)

    def url(self) -> str:
        """Where a browser on this machine finds the page (without the token)."""
        return self._server.url

    def start(self) -> bool:
        try:
            self._server.start()
            self.logger.info(f"the link's page: {self._server.url}")
        except OSError as error:  # the port was taken between two runs
            self.logger.error(f"no page: {error.strerror}")
        return True

    def stop(self) -> bool:
        self._server.stop()
        return True

    def _take(self, message) -> None:
        try:
            self._server.publish(with_cloud(json.loads(blocks_python.pmt_to_json(message)), message))
        except Exception as error:  # an exception here would end this block's thread
            self.logger.error(f"a message on `report` is no report: {error}")

# SPDX-License-Identifier: GPL-3.0-or-later
"""The recent samples that travel with a report's message and with no log."""

from __future__ import annotations

import pmt


def with_cloud(report: dict, message) -> dict:
    """The report with the message's `cloud` in it, where it has one, as complex numbers."""
    cloud = pmt.dict_ref(message, pmt.intern("cloud"), pmt.PMT_NIL) if pmt.is_dict(message) else pmt.PMT_NIL
    return {**report, "cloud": pmt.c32vector_elements(cloud)} if pmt.is_c32vector(cloud) else report

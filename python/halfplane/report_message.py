# SPDX-License-Identifier: GPL-3.0-or-later
"""What views take out of a message of link_watch."""

from __future__ import annotations

import json

import pmt

from . import blocks_python

_CLOUD = pmt.intern("cloud")


def report_of(message) -> dict:
    """The report, its `settings`, and as `cloud` the samples that came last (complex), where the message has them."""
    report = json.loads(blocks_python.pmt_to_json(message))
    cloud = pmt.dict_ref(message, _CLOUD, pmt.PMT_NIL) if pmt.is_dict(message) else pmt.PMT_NIL
    if pmt.is_c32vector(cloud) and isinstance(report, dict):
        report["cloud"] = pmt.c32vector_elements(cloud)
    return report

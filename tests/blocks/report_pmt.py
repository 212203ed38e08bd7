# SPDX-License-Identifier: GPL-3.0-or-later
"""A report as PMT and back: nothing lost, 64-bit counts stay unsigned."""

import json

import pmt
import pytest
from gnuradio import halfplane

REPORT = {
    "schema": "halfplane/report/1",
    "time": "2026-02-28T12:34:56.789Z",
    "confidence": 0.95,
    "window": {"first_symbol": 2**63 + 5, "ser": 1e-250, "phase_deg": -0.125},
    "total": {"excluded": {"before_lock": 0, "slip": 2**64 - 1}, "transitions": [[0, 1, 7, 6.5], [3, 2, 1, 0.25]]},
    "losses": [],
    "lock": {"state": "held", "mirrored": False, "inverted": True},
    "negative": -4,
}


def test_there_and_back():
    assert json.loads(halfplane.pmt_to_json(halfplane.json_to_pmt(json.dumps(REPORT)))) == REPORT


def test_order_of_fields_is_kept():
    text = json.dumps(REPORT, separators=(",", ":"))
    back = halfplane.pmt_to_json(halfplane.json_to_pmt(text))
    assert list(json.loads(back)) == list(REPORT)
    assert list(json.loads(back)["total"]) == list(REPORT["total"])


def test_counts_are_uint64():
    message = halfplane.json_to_pmt(json.dumps(REPORT))
    window = pmt.dict_ref(message, pmt.intern("window"), pmt.PMT_NIL)
    first = pmt.dict_ref(window, pmt.intern("first_symbol"), pmt.PMT_NIL)
    assert pmt.is_uint64(first) and pmt.to_uint64(first) == 2**63 + 5
    slip = pmt.to_python(message)["total"]["excluded"]["slip"]
    assert slip == 2**64 - 1


@pytest.mark.parametrize("text, pair", [
    # seconds since 1970 by `date -u -d … +%s`
    ("2026-02-28T12:34:56Z", (1772282096, 0.0)),
    ("2026-02-28T12:34:56.789Z", (1772282096, 0.789)),
    ("2026-12-31T23:59:59.000001Z", (1798761599, 0.000001)),
])
def test_time_is_a_tuple_of_seconds_and_fraction(text, pair):
    message = halfplane.json_to_pmt(json.dumps({"time": text}))
    time = pmt.to_python(message)["time"]
    assert time[0] == pair[0] and time[1] == pytest.approx(pair[1], abs=1e-12)
    back = json.loads(halfplane.pmt_to_json(message))["time"]
    assert back == (text if "." in text else text.replace("Z", ".000Z"))


@pytest.mark.parametrize("text", ["yesterday", "2026-02-28 12:34:56Z", "2026-02-28T12:34:56+01:00", ""])
def test_other_text_under_time_stays_text(text):
    assert pmt.to_python(halfplane.json_to_pmt(json.dumps({"time": text})))["time"] == text


@pytest.mark.parametrize("text", ["null", "[null]", '{"a": {"b": null}}', '{"a":', ""])
def test_refused(text):
    with pytest.raises(ValueError, match="json_to_pmt"):
        halfplane.json_to_pmt(text)


@pytest.mark.parametrize("message", [
    pmt.init_f32vector(2, [1, 2]),
    pmt.from_complex(1j),
    pmt.dict_add(pmt.make_dict(), pmt.from_long(1), pmt.PMT_T),
])
def test_what_no_report_holds_is_refused(message):
    with pytest.raises(ValueError, match="pmt_to_json"):
        halfplane.pmt_to_json(message)

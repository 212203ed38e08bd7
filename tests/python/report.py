# SPDX-License-Identifier: GPL-3.0-or-later
"""Logs are read or refused with file and line; the acceptance report shows their numbers, the same bytes each time."""

import hashlib
import json
import math
import os
import re
import subprocess
import sys
import tracemalloc
import xml.etree.ElementTree as xml
from html import unescape

import pypdf
import pytest
import sample_logs
import sample_reports
from command import document, halfplane, refused
from gnuradio.halfplane import views
from gnuradio.halfplane.acceptance import document as acceptance
from gnuradio.halfplane.views import source, words


def text_of(html):
    """What stands on the page, tags and drawings' titles apart."""
    html = re.sub(r"<(style|title|desc)[^>]*>.*?</\1>", " ", html, flags=re.S)
    return re.sub(r"[ \n]+", " ", unescape(re.sub(r"<[^>]+>", " ", html)))


@pytest.fixture
def log(tmp_path):
    return sample_logs.write(tmp_path / "firn.jsonl", sample_logs.settings_line(), *sample_logs.run())


def test_log_gives_settings_and_latest_report(log):
    read = source.read([log])
    assert len(read.runs) == 1 and read.runs[0].reports == 5 and read.runs[0].settings == sample_logs.settings()
    assert read.runs[0].report == list(sample_logs.run())[-1]
    assert (read.runs[0].first_line, read.runs[0].last_line) == (2, 6)
    assert read.logs[0].sha256 == hashlib.sha256(log.read_bytes()).hexdigest()


def test_message_gives_both():
    report = next(sample_logs.run())
    found = source.of_message({**report, "settings": sample_logs.settings()})
    assert found == (sample_logs.settings(), report)


def test_torn_lines_are_left_out_and_told(tmp_path, log):
    """At the end where a writer was stopped, in the midst where it went on afterwards."""
    whole = log.read_text().splitlines(keepends=True)
    for cut in (1, 5, len(whole[3]) // 2, len(whole[3]) - 3):
        torn = tmp_path / "torn.jsonl"
        torn.write_text("".join([*whole[:3], whole[3][:cut] + "\n", *whole[4:], whole[5][:cut]]))
        read = source.read([torn])
        assert read.logs[0].torn == [4, 7], cut
        assert read.runs[0].report == list(sample_logs.run())[-1]


@pytest.mark.parametrize(
    "line, said",
    [
        ("no report\n", "no JSON"),
        ('{"schema": "halfplane/report/1", "total": {}} trailing\n', "no JSON"),
        ("[1, 2]\n", "expected a JSON object"),
        ("{}\n", "no schema"),
        ('{"schema": "halfplane/report/2"}\n', "halfplane/report/2"),
        ('{"schema": "halfplane/settings/1"}\n', "without settings"),
        ('{"schema": "halfplane/report/1", "total": 3}\n', '"total" is no object'),
        ('{"schema": "halfplane/report/1", "settings_sha256": "%s", "total": {"in": -1}}\n' % sample_logs.DIGEST, "no count"),
        ('{"schema": "halfplane/report/1", "settings_sha256": "%s", "total": {"ser": NaN}}\n' % sample_logs.DIGEST, "NaN"),
        ('{"schema": "halfplane/report/1", "settings_sha256": "%s", "total": {"ser": "x"}}\n' % sample_logs.DIGEST, "no number"),
        ('{"schema": "halfplane/report/1", "losses": {}}\n', '"losses" is no list'),
        ('{"schema": "halfplane/report/1", "losses": [{"cause": "echo", "cost_db": "1"}]}\n', '"losses.cost_db" is no number'),
        ('{"schema": "halfplane/report/1", "confidence": null}\n', '"confidence" is no number'),
        ('{"schema": "halfplane/report/1", "total": {"predicted": {"exact": 1}}}\n', '"total.predicted.exact" is no object'),
        ('{"schema": "halfplane/report/1", "settings_sha256": "00"}\n', "stand nowhere above"),
    ],
)
def test_what_is_no_report_is_refused_with_its_place(tmp_path, line, said):
    bad = sample_logs.write(tmp_path / "bad.jsonl", sample_logs.settings_line(), next(sample_logs.run()), line)
    with pytest.raises(source.LogError) as refusal:
        source.read([bad])
    message = str(refusal.value)
    assert message.startswith(f"{bad}:3: ") and said in message, message


def test_what_is_not_one_link_is_refused(tmp_path, log):
    other = next(sample_logs.run())
    other["pattern"] = "o150:15"
    mixed = sample_logs.write(tmp_path / "mixed.jsonl", sample_logs.settings_line(), other)
    message = refused("report", log, mixed, "--json")
    assert f"{mixed}:2: pattern is o150:15, but draw:2026 at firn.jsonl:2" in message
    moved = sample_logs.settings()
    moved["points"][0][0] += 0.1
    mixed = sample_logs.write(tmp_path / "mixed.jsonl", sample_logs.settings_line(moved), next(sample_logs.run()))
    with pytest.raises(source.LogError, match="the set's points differ"):
        source.read([log, mixed])
    with pytest.raises(source.LogError, match="no report in it"):
        source.read([sample_logs.write(tmp_path / "empty.jsonl")])


def test_document_holds_the_logs_numbers(log):
    found = document("report", log, "--job", "Firn line")
    assert found["schema"] == "halfplane/acceptance/1" and found["job"] == "Firn line"
    assert found["logs"] == [{"file": "firn.jsonl", "sha256": hashlib.sha256(log.read_bytes()).hexdigest(), "bytes": log.stat().st_size, "reports": 5}]
    assert [point["report"] for point in found["points"]] == [list(sample_logs.run())[-1]]
    assert found["settings"] == sample_logs.settings() and "verdict" not in found


@pytest.mark.parametrize(
    "states, code, said", [(["pass", "pass"], 0, "pass"), (["pass", "fail"], 1, "fail"), (["undecided", "pass"], 3, "undecided"),
                           (["pass", None], 3, "undecided"), ([None, None], 0, None), (["undecided", "fail"], 1, "fail")],
)  # fmt: skip
def test_one_verdict_each_and_one_in_all(tmp_path, states, code, said):
    logs = [
        sample_logs.write(tmp_path / f"{k}.jsonl", sample_logs.settings_line(), *sample_logs.run(10.0 + 2 * k, verdict=state))
        for k, state in enumerate(states)
    ]
    done = halfplane("report", *logs, "--json", "--out", tmp_path / "out.html")
    assert done.returncode == code, done.stderr
    found = json.loads(done.stdout)
    assert found.get("verdict") == said and len(found["points"]) == 2
    page = text_of((tmp_path / "out.html").read_text())
    assert {"pass": "Passed", "fail": "Failed", "undecided": "Undecided", None: "no target was given"}[said] in page
    for state in filter(None, states):
        assert {"pass": "Passes: SER below 10⁻³", "fail": "Fails: SER below 10⁻³", "undecided": "Undecided: SER below 10⁻³"}[state] in page


def test_runs_in_one_log_are_points(tmp_path):
    log = sample_logs.write(tmp_path / "a.jsonl", sample_logs.settings_line(), *sample_logs.run(10.0), *sample_logs.run(14.0))
    found = document("report", log)
    assert [point["report"]["input"]["es_n0_db"] for point in found["points"]] == [10.0, 14.0]
    assert [point["lines"] for point in found["points"]] == [[2, 6], [7, 11]]


def test_page_shows_the_reports_numbers(tmp_path, log):
    out = tmp_path / "firn.html"
    assert halfplane("report", log, "--out", out, "--job", "Firn <line> & hut").returncode == 0
    html = out.read_text()
    assert "Firn &lt;line&gt; &amp; hut" in html
    page = text_of(html)
    total = list(sample_logs.run())[-1]["total"]
    for kind in ("ser", "ber"):
        for key in (kind, kind + "_low", kind + "_high"):
            assert words.rate(total[key]) in page, key
        for figures in total["predicted"].values():
            assert words.rate(figures[kind]) in page
    for number in (total["in"], total["judged"], total["pending"], total["symbol_errors"], total["bit_errors"], *total["excluded"].values()):
        assert words.count(number) in page
    for said in (
        "0.25 dB (0.18 to 0.33 dB)", "11.75 ± 0.01", "echo", "+0.08 dB", "fails by 0.12 dB", "not explained", "halfplane 0.1.0", "draw:2026",
        hashlib.sha256(log.read_bytes()).hexdigest(), sample_logs.DIGEST, "50\u202f000 symbols/s", "Target SER below 10⁻³", "Share that may be left out 0.001", "2026-03-01T06:00:01.000Z to 2026-03-01T06:00:05.000Z",
        *sample_logs.settings()["labels"],
    ):  # fmt: skip
        assert said in page, said


def test_page_loads_nothing_and_its_drawings_are_sound(tmp_path, log):
    halfplane("report", log, "--out", tmp_path / "firn.html")
    html = (tmp_path / "firn.html").read_text()
    assert not re.search(r'(src|href)="(?!#)', html) and "url(http" not in html and "<script" not in html and "@import" not in html
    assert "default-src 'none'" in html
    drawings = re.findall(r"<svg.*?</svg>", html, re.S)
    assert len(drawings) == 9  # heading, two curves, history, ladder, map, losses, account, and the set
    ids = [each for drawing in drawings for each in re.findall(r'id="([^"]+)"', drawing)]
    assert len(ids) == len(set(ids))
    for drawing in drawings:
        xml.fromstring(drawing)


def test_the_same_log_gives_the_same_bytes(tmp_path, log):
    """Two processes, with hashes seeded differently, at different times."""
    for ending in ("html", "pdf"):
        made = []
        for seed in ("1", "2"):
            out = tmp_path / f"{seed}.{ending}"
            subprocess.run(
                [sys.executable, "-m", "gnuradio.halfplane", "report", log, "--out", out], check=True, capture_output=True,
                env={**os.environ, "PYTHONHASHSEED": seed},
            )  # fmt: skip
            made.append(out.read_bytes())
        assert made[0] == made[1], ending
        assert made[0].startswith(b"<!DOCTYPE html>" if ending == "html" else b"%PDF-")


def test_pdf_holds_the_words(tmp_path, log):
    halfplane("report", log, "--out", tmp_path / "firn.pdf", "--job", "Firn line")
    text = " ".join(page.extract_text() for page in pypdf.PdfReader(tmp_path / "firn.pdf").pages)
    assert "Firn line" in text and hashlib.sha256(log.read_bytes()).hexdigest()[:20] in text.replace("\n", "")


def test_against_a_stored_run(tmp_path, log):
    bench = sample_logs.write(tmp_path / "bench.jsonl", sample_logs.settings_line(), *sample_logs.run(11.8), *sample_logs.run(16.0))
    stored = tmp_path / "bench.json"
    stored.write_text(halfplane("report", bench, "--json", "--job", "on the bench").stdout)
    found = document("report", log, "--against", stored)
    compared = found["against"]["points"][0]
    then, now = list(sample_logs.run(11.8))[-1], list(sample_logs.run())[-1]
    assert compared["es_n0_db"] == 11.8 and compared["ser"] == then["total"]["ser"]
    change = compared["shortfall_change_db"]["input"]
    assert change["db"] == now["shortfall"]["input"]["db"] - then["shortfall"]["input"]["db"] == 0
    assert math.isclose(change["db_high"], math.hypot(0.08, 0.07)) and math.isclose(change["db_low"], -math.hypot(0.07, 0.08))
    far = sample_logs.write(tmp_path / "far.jsonl", sample_logs.settings_line(), *sample_logs.run(14.0))
    assert document("report", far, "--against", stored)["against"]["points"] == [{}]
    out = tmp_path / "out.html"
    halfplane("report", log, "--against", stored, "--out", out)
    page = text_of(out.read_text())
    assert "on the bench" in page and words.rate(then["total"]["ser"]) in page and "0.00 dB (−0.11 to 0.11 dB)" in page
    assert found["against"]["sha256"] in page


def test_what_is_no_baseline_is_refused(tmp_path, log):
    mine = acceptance.of_logs(source.read([log]))
    for content in ("{", "[]", '{"schema": "halfplane/acceptance/1"}', '{"schema": "halfplane/acceptance/1", "points": [3]}',
                    '{"schema": "halfplane/acceptance/1", "points": []}'):  # fmt: skip
        stored = tmp_path / "stored.json"
        stored.write_text(content)
        with pytest.raises(ValueError, match=re.escape(str(stored))):
            acceptance.set_against(mine, stored)
    assert str(stored) in refused("report", log, "--json", "--against", stored)
    other = json.loads(json.dumps(mine))
    other["points"][0]["report"]["set"] = "another"
    stored.write_text(json.dumps(other))
    with pytest.raises(ValueError, match="set is another, but firn-12"):
        acceptance.set_against(mine, stored)


def test_usage_is_checked_before_anything_is_read(tmp_path, log):
    assert "--out FILE" in refused("report", log)
    assert ".html or .pdf" in refused("report", log, "--out", tmp_path / "x.doc")
    assert "there is no folder" in refused("report", log, "--out", tmp_path / "none" / "x.html")
    assert "does not exist" in refused("report", tmp_path / "none.jsonl", "--json")


def test_run_that_was_put_aside_is_one_point(tmp_path):
    reports = list(sample_logs.run(number=6))
    first = sample_logs.write(tmp_path / "a.jsonl.1", sample_logs.settings_line(), *reports[:4])
    second = sample_logs.write(tmp_path / "a.jsonl", sample_logs.settings_line(), *reports[4:])
    found = document("report", first, second)
    assert [(point["log"], point["lines"], point["report"]["sequence"]) for point in found["points"]] == [(1, [2, 3], 5)]
    assert found["points"][0]["first_time"] == "2026-03-01T06:00:01.000Z"
    assert len(document("report", second, first)["points"]) == 2


def test_log_without_settings_is_reported_on(tmp_path):
    """As logs were before settings stood in them: no map, no curve, all numbers."""
    log = sample_logs.write(tmp_path / "old.jsonl", *sample_logs.run())
    assert halfplane("report", log, "--out", tmp_path / "old.html").returncode == 0
    page = text_of((tmp_path / "old.html").read_text())
    assert words.rate(list(sample_logs.run())[-1]["total"]["ser"]) in page and "Decision cells" not in page


def test_report_printed_over_several_lines_is_read(tmp_path):
    report = list(sample_logs.run())[-1]
    log = tmp_path / "one.json"
    log.write_text(json.dumps({**report, "settings": sample_logs.settings()}, indent=2))
    found = document("report", log)
    assert found["points"][0]["report"] == report and found["settings"] == sample_logs.settings()


def test_drawings_that_say_the_same_have_ids_of_their_own(tmp_path):
    searching = [{**sample_reports.searching(), "schema": "halfplane/report/1", "sequence": 0} for _ in range(2)]
    log = sample_logs.write(tmp_path / "a.jsonl", *searching)
    halfplane("report", log, "--out", tmp_path / "a.html")
    ids = re.findall(r' id="([^"]+)"', (tmp_path / "a.html").read_text())
    assert len(ids) == len(set(ids)) > 10


def test_run_that_never_locked_is_reported_on(tmp_path):
    searching = {**sample_reports.searching(), "schema": "halfplane/report/1", "sequence": 0, "settings_sha256": sample_logs.DIGEST}
    log = sample_logs.write(tmp_path / "lost.jsonl", sample_logs.settings_line(), searching)
    assert halfplane("report", log, "--out", tmp_path / "lost.html").returncode == 0
    assert "Searching" in text_of((tmp_path / "lost.html").read_text())


def test_memory_does_not_grow_with_the_log(tmp_path):
    def peak(number):
        path = sample_logs.write(tmp_path / "long.jsonl", sample_logs.settings_line(), *sample_logs.run(number=number))
        tracemalloc.start()
        read = source.read([path])
        used = tracemalloc.get_traced_memory()[1]
        tracemalloc.stop()
        assert read.logs[0].reports == number and isinstance(read.trace, views.Trace)
        return used

    assert peak(2000) < 1.3 * peak(700)


def test_overall_is_the_worst():
    assert acceptance.overall(["pass"]) == "pass" and acceptance.overall(["pass", "undecided", "fail"]) == "fail"


@pytest.mark.parametrize("name", ["live", "partly", "full"])
def test_what_was_not_known_in_advance_stands_apart(tmp_path, name):
    report = {**getattr(sample_reports, name)(), "schema": source.REPORT, "sequence": 0, "settings_sha256": sample_logs.DIGEST}
    log = sample_logs.write(tmp_path / "link.jsonl", sample_logs.settings_line(), report)
    assert halfplane("report", log, "--out", tmp_path / "link.html").returncode in (0, 3)
    table = re.search(r"<caption>Live traffic.*?</table>", (tmp_path / "link.html").read_text())
    assert (table is None) == (name == "full")
    if table:
        said, total = unescape(table[0]), report["total"]
        live = total["live_part"]
        assert words.count(live["symbols"]) in said and words.gauged(live) in said and words.rate(live["predicted"]["exact"]["ser"]) in said
        assert said.count("cannot be counted") == 1
        assert ("known by decoding alone</td>" in said) == ("decoded_part" in total)


@pytest.mark.parametrize("part, said", [
    ({"live": -1}, '"total.live" is no count'), ({"live_part": 3}, '"total.live_part" is no object'),
    ({"decoded_part": {"ser": "x"}}, '"total.decoded_part" is no object'), ({"live_part": {"predicted": 1}}, '"total.live_part" is no object'),
    ({"live_part": {"predicted": {"exact": {"ser": None}}}}, '"total.live_part.predicted" holds'),
])  # fmt: skip
def test_parts_that_make_no_sense_are_refused(part, said):
    report = {**sample_reports.live(), "schema": source.REPORT}
    source.of_message(report)
    report["total"] = {**report["total"], **part}
    with pytest.raises(source.LogError, match=said):
        source.of_message(report)

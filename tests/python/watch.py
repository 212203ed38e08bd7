# SPDX-License-Identifier: GPL-3.0-or-later
"""The terminal view of a link that runs elsewhere: from its growing log, across rotation, and from its page."""

import http.server
import io
import json
import os
import subprocess
import threading
import time

import pytest
import sample_logs
import sample_reports
from command import BUILD, halfplane, refused
from gnuradio.halfplane import follow, watching
from gnuradio.halfplane.views import source
from rich.console import Console


def line(document):
    return json.dumps(document) + "\n"


def sequences(link):
    return [record.report["sequence"] for record in link.poll()]


def test_log_is_followed_as_it_grows(tmp_path):
    reports = list(sample_logs.run(number=6))
    log = sample_logs.write(tmp_path / "a.jsonl", sample_logs.settings_line(), reports[0])
    link = follow.follow(str(log))
    assert sequences(link) == [0] and sequences(link) == []
    with open(log, "a") as stream:
        text = line(reports[1])
        stream.write(text[:30])
        stream.flush()
        assert sequences(link) == []  # half a line waits
        stream.write(text[30:] + line(reports[2]))
        stream.flush()
        assert sequences(link) == [1, 2]
        stream.write(line(reports[3])[:50] + "\n" + line(reports[4]))  # torn by a crash, closed off by the next writer
    assert sequences(link) == [4]
    link.close()


def test_log_is_followed_across_rotation(tmp_path):
    """What was written to the old file after the last look is not lost; until the new one is there, nothing is refused."""
    reports = list(sample_logs.run(number=6))
    log = sample_logs.write(tmp_path / "a.jsonl", sample_logs.settings_line(), reports[0])
    link = follow.follow(str(log))
    assert sequences(link) == [0]
    with open(log, "a") as stream:
        stream.write(line(reports[1]))
    os.rename(log, tmp_path / "a.jsonl.1")
    assert sequences(link) == [1]
    sample_logs.write(log, sample_logs.settings_line(), reports[2], reports[3])
    found = list(link.poll())
    assert [record.report["sequence"] for record in found] == [2, 3]
    assert found[0].settings == sample_logs.settings()
    log.write_text(line(sample_logs.settings_line()) + line(reports[4])[:-1] + "\n")  # emptied and written anew, shorter
    assert sequences(link) == [4]
    link.close()


def test_what_is_written_while_the_log_is_put_aside_is_not_lost(tmp_path):
    """A report written between the look at the file and the look at its name."""
    reports = list(sample_logs.run())
    log = sample_logs.write(tmp_path / "a.jsonl", sample_logs.settings_line(), reports[0])
    link = follow.follow(str(log))
    was_replaced = link._was_replaced

    def in_between():
        with open(log, "a") as stream:
            stream.write(line(reports[1]))
        os.rename(log, tmp_path / "a.jsonl.1")
        sample_logs.write(log, sample_logs.settings_line(), reports[2])
        return was_replaced()

    link._was_replaced = in_between
    assert sequences(link) == [0, 1, 2]
    link.close()


def test_line_that_is_no_report_is_refused_with_its_place(tmp_path):
    log = sample_logs.write(tmp_path / "a.jsonl", next(sample_logs.run()), "something else\n")
    with pytest.raises(source.LogError, match="a.jsonl:2: no JSON"):
        list(follow.follow(str(log)).poll())
    assert f"{log}:2: no JSON" in refused("watch", log, "--once")


class Page(http.server.BaseHTTPRequestHandler):
    """As link_page answers /report."""

    report = None
    token = ""

    def do_GET(self):
        wanted = f"Bearer {self.token}" if self.token else None
        if wanted and self.headers.get("Authorization") != wanted:
            self.send_error(401)
        elif self.path != "/report" or self.report is None:
            self.send_error(404)
        else:
            body = self.report if isinstance(self.report, bytes) else json.dumps(self.report).encode()
            self.send_response(200)
            self.end_headers()
            self.wfile.write(body)

    def log_message(self, *_):
        pass


@pytest.fixture
def page():
    Page.report, Page.token = None, ""
    server = http.server.ThreadingHTTPServer(("127.0.0.1", 0), Page)
    threading.Thread(target=server.serve_forever, daemon=True).start()
    yield f"http://127.0.0.1:{server.server_port}/"
    server.shutdown()
    server.server_close()


def test_page_is_followed(page):
    link = follow.follow(page)
    assert list(link.poll()) == []
    reports = list(sample_logs.run())
    Page.report = {**reports[0], "settings": sample_logs.settings()}
    found = list(link.poll())
    assert found[0].report == reports[0] and found[0].settings == sample_logs.settings()
    assert list(link.poll()) == []  # the same once more is no news
    Page.report = reports[1]
    assert sequences(link) == [1]


def test_page_that_wants_a_token(page):
    Page.report, Page.token = next(sample_logs.run()), "sesame-sesame-sesame"
    with pytest.raises(ConnectionError, match="401.*token"):
        list(follow.follow(page).poll())
    assert sequences(follow.follow(page, Page.token)) == [0]
    assert sequences(follow.follow(page + f"?token={Page.token}")) == [0]
    done = halfplane("watch", page, "--once", "--token", Page.token)
    assert done.returncode == 0 and "firn-12" in done.stdout
    assert Page.token not in done.stdout


def test_page_that_does_not_answer_is_told():
    assert "127.0.0.1:9" in refused("watch", "http://127.0.0.1:9/", "--once")
    assert "http://HOST:PORT/" in refused("watch", "ftp://x/", "--once")


@pytest.mark.parametrize("body", [b"{", b"[]", b'{"schema": "other"}', b"\xff\xfe"])
def test_page_that_answers_something_else_is_told(page, body):
    Page.report = body
    text = refused("watch", page, "--once")
    assert "no report" in text or "schema" in text


def test_once_shows_the_latest_report(tmp_path):
    log = sample_logs.write(tmp_path / "a.jsonl", sample_logs.settings_line(), *sample_logs.run(verdict="undecided"))
    done = halfplane("watch", log, "--once")
    assert done.returncode == 0, done.stderr
    total = list(sample_logs.run())[-1]["total"]
    for said in (
        f"{total['ser']:.2e}", f"{total['ber']:.2e}", "● Locked", "0.25 dB short at the input", "Undecided: SER below 10⁻³",
        "echo", "+0.08", "not explained", "+0.08", "fails by 0.12 dB", "too few symbols", "symbol errors 400",
    ):  # fmt: skip
        assert said in done.stdout, said
    assert "\x1b" not in done.stdout


def test_nothing_to_show_is_refused(tmp_path):
    assert "no report yet" in refused("watch", sample_logs.write(tmp_path / "a.jsonl"), "--once")
    assert "No such file" in refused("watch", tmp_path / "none.jsonl", "--once")


def test_without_a_terminal_each_report_gives_a_line(tmp_path):
    reports = list(sample_logs.run())
    log = sample_logs.write(tmp_path / "a.jsonl", sample_logs.settings_line(), reports[0])
    with subprocess.Popen([str(BUILD / "halfplane"), "watch", str(log)], stdout=subprocess.PIPE, text=True) as running:
        first = running.stdout.readline()
        with open(log, "a") as stream:
            stream.write(line(reports[1]))
        second = running.stdout.readline()
        running.send_signal(2)  # as Ctrl-C does
        assert running.wait(30) == 0
    assert first.startswith(reports[0]["time"]) and second.startswith(reports[1]["time"])
    assert f"errors {reports[1]['total']['symbol_errors']}," in second


@pytest.mark.parametrize("width", [70, 80, 100, 160])
@pytest.mark.parametrize(
    "report", [sample_reports.full(), sample_reports.step(18.0), sample_reports.silent(), sample_reports.searching(), {}],
    ids=["full", "low", "silent", "searching", "empty"],
)  # fmt: skip
def test_screen_fits_the_width(width, report):
    console = Console(file=io.StringIO(), width=width, force_terminal=False, highlight=False)
    console.print(watching.screen(report, "/somewhere/far/away/in/a/deep/folder/firn-out/reports.jsonl", width))
    lines = console.file.getvalue().splitlines()
    assert max(map(len, lines)) <= width
    beside = any("Locked?" in each and "How sure is that?" in each for each in lines)
    assert beside == (width >= 90)


def test_screen_on_a_terminal_is_drawn_again(tmp_path):
    """In a pseudo-terminal: the second report appears, and Ctrl-C ends it well."""
    reports = list(sample_logs.run())
    log = sample_logs.write(tmp_path / "a.jsonl", sample_logs.settings_line(), reports[0])
    near, far = os.openpty()
    with subprocess.Popen([str(BUILD / "halfplane"), "watch", str(log)], stdout=far, stderr=far, env={**os.environ, "TERM": "xterm"}) as running:
        os.close(far)
        seen = read_until(near, reports[0]["time"])
        with open(log, "a") as stream:
            stream.write(line(reports[1]))
        seen += read_until(near, reports[1]["time"])
        running.send_signal(2)
        drain = threading.Thread(target=read_until, args=(near, "never said"), daemon=True)
        drain.start()
        assert running.wait(30) == 0
    os.close(near)
    assert "Locked" in seen


def read_until(terminal, wanted, seconds=60):
    """What a pseudo-terminal shows until a word has been seen, or it was closed."""
    seen, end = "", time.monotonic() + seconds
    while wanted not in seen and time.monotonic() < end:
        try:
            seen += os.read(terminal, 65536).decode(errors="replace")
        except OSError:
            return seen
    assert wanted in seen or wanted == "never said"
    return seen

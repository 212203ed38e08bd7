# SPDX-License-Identifier: GPL-3.0-or-later
"""The page's server: what it answers, to whom, and what it refuses; many clients, slow ones, and a long run."""

import asyncio
import contextlib
import json
import os
import socket
import sys
import threading
import time
import tracemalloc
import xml.etree.ElementTree as xml

import pytest
import sample_reports
from page_client import Stream, get, raw
from views import SETTINGS

from gnuradio.halfplane import views
from gnuradio.halfplane.page import limits
from gnuradio.halfplane.page.server import Server
from gnuradio.halfplane.page.stream import Client

TOKEN = "avalanche-0123456789"
FULL = {**sample_reports.full(), "sequence": 0, "settings": SETTINGS, "settings_sha256": "00"}


@contextlib.contextmanager
def serving(**options):
    server = Server(port=0, **options)
    server.start()
    try:
        yield server
    finally:
        server.stop()


@pytest.fixture
def server():
    with serving() as found:
        yield found


def test_the_report_is_the_one_published(server):
    assert get(server, "/report")[0] == 404
    server.publish(FULL)
    status, headers, body = get(server, "/report")
    assert status == 200 and headers["Content-Type"].startswith("application/json")
    assert json.loads(body) == FULL
    server.publish(sample_reports.step(10.0))
    assert json.loads(get(server, "/report")[2]) == sample_reports.step(10.0)  # without settings of another digest


@pytest.mark.parametrize("path", ["/", "/page.css", "/page.js", "/roles.css", "/icon.svg", "/report", "/metrics", "/log", "/elsewhere", "/../page.html"])
def test_every_answer_has_the_headers_of_a_closed_page(server, path):
    server.publish(FULL)
    _, headers, _ = get(server, path)
    policy = dict(part.strip().split(" ", 1) for part in headers["Content-Security-Policy"].split(";"))
    assert policy["default-src"] == "'none'" and policy["frame-ancestors"] == "'none'" and policy["base-uri"] == "'none'"
    assert all(sources in ("'self'", "'none'") for sources in policy.values())
    assert headers["X-Content-Type-Options"] == "nosniff" and headers["Referrer-Policy"] == "no-referrer"
    assert headers["Cache-Control"] == "no-store" and "Access-Control-Allow-Origin" not in headers
    assert "aiohttp" not in headers["Server"]


def test_nothing_on_the_page_comes_from_elsewhere_or_stands_inline(server):
    page = get(server, "/")[2].decode()
    assert "<script>" not in page and "style=" not in page and " on" + "click" not in page
    for path in ("/", "/page.css", "/page.js", "/roles.css"):
        text = get(server, path)[2].decode().replace("http://www.w3.org/2000/svg", "")
        assert "http:" not in text and "https:" not in text and "//cdn" not in text and "@import" not in text


def test_only_get_and_head(server):
    server.publish(FULL)
    for method in ("POST", "PUT", "DELETE", "OPTIONS", "PATCH", "TRACE"):
        status, headers, _ = get(server, "/report", method)
        assert status == 405 and headers["Allow"] == "GET, HEAD", method
    assert get(server, "/report", "FROBNICATE")[0] in (400, 405)  # the parser may know it for no method
    for path in ("/", "/report", "/metrics", "/events"):
        status, _, body = get(server, path, "HEAD")
        assert status == 200 and body == b"", path


@pytest.mark.parametrize("host, status", [
    ("127.0.0.1:80", 200), ("localhost", 200), ("LOCALHOST:8321", 200), ("[::1]:8321", 200), ("192.0.2.7", 200), ("hut.example", 200),
    ("rebound.example", 421), ("localhost.rebound.example", 421), ("127.0.0.1.rebound.example", 421), ("", 421), ("localhost:x", 421),
    ("[::1", 421), ("127.0.0.1@rebound.example", 421),
])  # fmt: skip
def test_the_host_must_be_ours(host, status):
    """A name that resolves here but is not ours is how a page elsewhere would read this one (DNS rebinding)."""
    with serving(names=("hut.example",)) as server:
        assert get(server, "/", Host=host)[0] == status


def test_two_hosts_or_none_are_refused(server):
    two = raw(server, b"GET / HTTP/1.1\r\nHost: localhost\r\nHost: localhost\r\n\r\n")
    assert two.split()[1] in (b"400", b"421")  # the parser may refuse it first
    assert raw(server, b"GET / HTTP/1.0\r\n\r\n").split()[1] == b"421"


@pytest.mark.parametrize("options, message", [
    ({"address": "0.0.0.0"}, "token is demanded"), ({"address": "::1"}, "token is demanded"), ({"address": "localhost"}, "IP address"),
    ({"address": ""}, "IP address"), ({"token": "short"}, "token is not fit"), ({"address": "0.0.0.0", "token": "with space 0123456789"}, "not fit"),
])  # fmt: skip
def test_what_is_not_fit_is_refused_at_construction(options, message):
    with pytest.raises(ValueError, match=message):
        Server(port=0, **options)
    with pytest.raises(ValueError, match="port is 65536"):
        Server(port=65536)


def test_the_token_opens_what_tells_of_the_link():
    with serving(address="0.0.0.0", token=TOKEN, log=__file__) as server:
        server.publish(FULL)
        for path in ("/", "/report", "/metrics", "/events", "/log"):
            status, headers, body = get(server, path)
            assert status == 401 and headers["WWW-Authenticate"].startswith("Bearer") and b"firn" not in body, path
            assert get(server, f"{path}?token={TOKEN[:-1]}", "HEAD")[0] == 401
            assert get(server, f"{path}?token={TOKEN}x", "HEAD")[0] == 401
            assert get(server, f"{path}?token=%00%ff", "HEAD")[0] == 401
            assert get(server, path, "HEAD", Authorization=f"Basic {TOKEN}")[0] == 401
            assert get(server, path, "HEAD", Authorization=f"Bearer {TOKEN}")[0] == 200, path
            assert get(server, f"{path}?token={TOKEN}", "HEAD")[0] == 200, path
        assert get(server, "/page.js")[0] == 200  # says nothing of the link
        assert TOKEN.encode() not in get(server, f"/?token={TOKEN}")[2]
        assert Stream(server).status == 401
        stream = Stream(server, f"token={TOKEN}")
        assert json.loads(stream.until("summary"))["set"] == "firn-12"
        stream.close()


def test_the_log_is_what_stands_in_the_file(tmp_path, server):
    assert get(server, "/log")[0] == 404
    log = tmp_path / 'fi"rn.jsonl'
    with serving(log=str(log)) as other:
        assert get(other, "/log")[0] == 404
        log.write_bytes(b"".join(json.dumps({"sequence": k, "text": "x" * 999}).encode() + b"\n" for k in range(3000)))
        status, headers, body = get(other, "/log")
        assert status == 200 and body == log.read_bytes()
        assert headers["Content-Disposition"] == 'attachment; filename="fi_rn.jsonl"'


def test_logs_put_aside_are_listed_and_offered_by_number(tmp_path, server):
    """And nothing else of the directory, whatever is asked for."""
    log = tmp_path / "link.jsonl"
    for name, text in (("link.jsonl", "now"), ("link.jsonl.1", "first"), ("link.jsonl.2", "2nd"), ("link.jsonl.10", "tenth"), ("link.jsonl.carry", "secret"),
                       ("link.jsonl.01", "secret"), ("link.jsonl.1.txt", "secret"), ("other", "secret")):  # fmt: skip
        (tmp_path / name).write_text(text)
    (tmp_path / "link.jsonl.3").symlink_to(tmp_path / "other")
    os.mkfifo(tmp_path / "link.jsonl.4")
    (tmp_path / "link.jsonl.5").mkdir()
    assert json.loads(get(server, "/logs")[2]) == []
    with serving(log=str(log)) as other:
        listed = json.loads(get(other, "/logs")[2])
        assert [each["path"] for each in listed] == ["log/1", "log/2", "log/10", "log"]
        assert [each["file"] for each in listed] == ["link.jsonl.1", "link.jsonl.2", "link.jsonl.10", "link.jsonl"]
        for each, text in zip(listed, ("first", "2nd", "tenth", "now")):
            status, headers, body = get(other, "/" + each["path"])
            assert (status, body.decode(), each["bytes"]) == (200, text, len(text))
            assert headers["Content-Disposition"] == f'attachment; filename="{each["file"]}"'
        for wrong in ("3", "4", "5", "6", "01", "carry", "1.txt", "", "0", "-1", "+1", "1/", "../other", "..%2Fother", "%2e%2e/other", "1%00", "%31%0a", "9" * 10,
                      "%D9%A1", "1/../../other"):  # fmt: skip
            status, _, body = get(other, "/log/" + wrong)
            assert status in (400, 404) and b"secret" not in body, wrong
    with serving(log=str(log), token=TOKEN) as other:
        assert get(other, "/logs")[0] == get(other, "/log/1")[0] == 401
        assert get(other, f"/log/1?token={TOKEN}")[2] == b"first"


def test_events_show_each_view_of_the_latest_report(server):
    stream = Stream(server, "layout=narrow")
    server.publish(FULL)
    said = json.loads(stream.until("summary"))
    assert [each["answer"] for each in said["answers"]] == [each.answer for each in views.answers(FULL)]
    seen = {}
    while len(seen) < 6:
        name, data = stream.next()
        seen[name] = data
    for name, data in seen.items():
        if name != "summary":
            assert xml.fromstring(data).tag == "{http://www.w3.org/2000/svg}svg"
            assert "style=" not in data
    later = {**FULL, "sequence": 1, "total": {**FULL["total"], "symbol_errors": 987_654}}
    server.publish(later)
    stream.until("summary", lambda data: "987\u202f654" in json.loads(data)["answers"][2]["detail"])
    stream.close()
    assert get(server, "/events?layout=round")[0] == 400


def test_a_hundred_pages_at_once(server):
    """All see the last report, and none is left behind when they go."""
    streams = [Stream(server, f"layout={layout}") for layout in ("wide", "narrow") for _ in range(50)]
    assert {stream.status for stream in streams} == {200}
    for sequence in range(30):
        server.publish({**FULL, "sequence": sequence})
        time.sleep(0.01)
    for stream in streams:
        stream.until("summary", lambda data: json.loads(data)["sequence"] == 29)
        while not {"ladder", "decision_map", "account"} <= stream.seen:
            stream.seen.add(stream.next()[0])
    assert b"halfplane_page_clients 100.0" in get(server, "/metrics")[2]
    for stream in streams:
        stream.close()
    end = time.monotonic() + 10
    while b"halfplane_page_clients 0.0" not in get(server, "/metrics")[2]:
        assert time.monotonic() < end
        server.publish({**FULL, "sequence": 30})
        time.sleep(0.05)


def test_no_more_pages_than_may_be(server, monkeypatch):
    monkeypatch.setattr(limits, "STREAMS", 3)
    streams = [Stream(server) for _ in range(3)]
    assert get(server, "/events")[0] == 503
    assert get(server, "/report")[0] == 404  # the rest is answered
    for stream in streams:
        stream.close()


def test_no_more_connections_than_may_be(server, monkeypatch):
    monkeypatch.setattr(limits, "CONNECTIONS", 5)
    held = [socket.create_connection((server.address, server.port)) for _ in range(5)]
    time.sleep(0.3)
    assert raw(server, b"").startswith(b"HTTP/1.1 503 ")
    for each in held:
        each.close()
    time.sleep(0.3)
    assert get(server, "/")[0] == 200


def test_a_client_that_does_not_read_holds_up_nobody(server, monkeypatch):
    monkeypatch.setattr(limits, "WRITE_SECONDS", 1.0)
    monkeypatch.setattr(limits, "UNSENT", 4096)
    deaf, stream = Stream(server, room=4096), Stream(server)
    sequence = 0
    end = time.monotonic() + 20
    while b"halfplane_page_clients 1.0" not in get(server, "/metrics")[2]:  # until the deaf one is cut off
        assert time.monotonic() < end, "a client that reads nothing is still there"
        total = {**FULL["total"], "symbol_errors": sequence}
        server.publish({**FULL, "sequence": sequence, "total": total})
        assert json.loads(stream.until("summary"))["sequence"] <= sequence
        sequence += 1
        time.sleep(0.02)
    stream.close()
    deaf.close()


def test_a_client_keeps_the_newest_of_each_view_only():
    async def give_and_take():
        client = Client("wide")
        for k in range(10_000):
            client.give("ladder", b"l%d;" % k)
            client.give("account", b"a%d;" % k)
        client.give("ladder", b"last;")
        return await client.take()

    assert asyncio.run(give_and_take()) == b"a9999;last;"


def test_what_a_live_page_sends_on_is_dropped(server):
    stream = Stream(server)
    stream.socket.sendall(b"GET / HTTP/1.1\r\nHost: localhost\r\n\r\n" * 5000)
    time.sleep(0.3)
    server.publish({**FULL, "sequence": 7})
    assert json.loads(stream.until("summary"))["sequence"] == 7
    stream.close()


@pytest.mark.parametrize("data, status", [
    (b"GET /" + b"a" * 5000 + b" HTTP/1.1\r\nHost: localhost\r\n\r\n", 400),
    (b"GET / HTTP/1.1\r\nHost: localhost\r\nX: " + b"a" * 9000 + b"\r\n\r\n", 400),
    (b"GET / HTTP/1.1\r\nHost: localhost\r\n" + b"X: a\r\n" * 5000 + b"\r\n", 431),
    (b"GET / HTTP/1.1\r\nHost: localhost\r\nX: " + b"a" * 200_000, 431),
    (b"POST /report HTTP/1.1\r\nHost: localhost\r\nContent-Length: 9\r\n\r\n123456789", 405),
    (b"GET /report HTTP/1.1\r\nHost: localhost\r\nContent-Length: 9\r\n\r\n123456789", 413),
    (b"GET /report HTTP/1.1\r\nHost: localhost\r\nContent-Length: 99999999999\r\n\r\n123", 413),
    (b"GET /report HTTP/1.1\r\nHost: localhost\r\nTransfer-Encoding: chunked\r\n\r\nfff\r\n", 413),
    (b"GET /report HTTP/1.1\r\nHost: localhost\r\nContent-Length: -1\r\n\r\n", 400),
    (b"GET / HTTP/1.1 and more\r\n\r\n", 400),
    (b"GET / HTTP/9.9.9\r\n\r\n", 400),
    (b"\x16\x03\x01\x02\x00\x01\x00\x01\xfc\x03\x03" + bytes(range(256)), 400),
    (b"\x00" * 1000 + b"\r\n\r\n", 400),
    (b"GET / HTTP/1.1\r\nHost: localhost\r\nno colon here\r\n\r\n", 400),
    (b"\r\n\r\n\r\n\r\nPRI * HTTP/2.0\r\n\r\nSM\r\n\r\n", 400),
])  # fmt: skip
def test_what_makes_no_sense_is_refused_and_forgotten(server, data, status, caplog):
    server.publish(FULL)
    answer = raw(server, data)
    assert answer is not None and answer.split()[1] == str(status).encode()
    assert b"Traceback" not in answer and get(server, "/report")[0] == 200
    assert not caplog.records  # nobody fills a disk with tracebacks


def test_one_connection_carries_one_request(server):
    server.publish(FULL)
    one = b"GET /report HTTP/1.1\r\nHost: localhost\r\n\r\n"
    assert raw(server, one + one + one).count(b"HTTP/1.1 200 ") == 1


def test_slow_requests_are_cut():
    with serving(head_seconds=0.5) as server:
        began = time.monotonic()
        with socket.create_connection((server.address, server.port), timeout=10) as link:
            ended = False
            for byte in b"GET / HTTP/1.1\r\nHost: localhost\r\nX-Slow: aaaaaaaaaaaaaaaaaaaaaaaaaaaaa":
                try:
                    link.sendall(bytes([byte]))
                    time.sleep(0.05)
                except (ConnectionResetError, BrokenPipeError):
                    ended = True
                    break
            assert ended and time.monotonic() - began < 3
        assert raw(server, b"") == b""  # one that says nothing, too
        assert get(server, "/")[0] == 200


def test_a_port_in_use_is_an_error_that_names_it(server):
    with pytest.raises(OSError, match=f"port {server.port} on 127.0.0.1 cannot be had: Address already in use"):
        Server(port=server.port)


def test_stop_gives_all_back_and_start_begins_again():
    server = Server(port=0)
    for _ in range(3):
        server.start()
        server.start()  # once is enough
        stream = Stream(server)
        server.publish(FULL)
        stream.until("summary")
        server.stop()
        with pytest.raises((EOFError, ConnectionResetError)):
            while True:
                stream.next()
        stream.close()
        assert not [thread for thread in threading.enumerate() if thread.name == "halfplane page"]
        with socket.socket() as other:
            other.setsockopt(socket.SOL_SOCKET, socket.SO_REUSEADDR, 1)
            other.bind((server.address, server.port))
    server.stop()
    server.publish(FULL)  # shown from the next start on


def test_reports_that_are_none_change_nothing(server, caplog):
    server.publish(FULL)
    for wrong in (None, [], "text", {"total": 3}):
        with pytest.raises(ValueError, match="a report is wanted"):
            server.publish(wrong)
    assert json.loads(get(server, "/report")[2]) == FULL
    stream = Stream(server)
    server.publish({**FULL, "losses": 17})  # one view cannot be drawn of this; the others are
    stream.until("summary")
    while not {"ladder", "account", "curve"} <= stream.seen:
        stream.seen.add(stream.next()[0])
    stream.close()
    assert sum("losses" in record.getMessage() for record in caplog.records) == 1


def test_memory_is_flat_over_ten_thousand_reports(server):
    """Two pages read, one does not; after the first thousand reports nothing is kept that was not before."""
    streams = [Stream(server), Stream(server, "layout=narrow"), Stream(server)]
    readers = [threading.Thread(target=_drain, args=(stream,), daemon=True) for stream in streams[:2]]
    for reader in readers:
        reader.start()
    tracemalloc.start()
    try:
        sizes = []
        for sequence in range(10_000):
            total = {**FULL["total"], "in": FULL["total"]["in"] + 1000 * sequence}
            server.publish({**FULL, "sequence": sequence, "total": total})
            if sequence % 3000 == 1500:
                time.sleep(0.5)
                sizes.append(tracemalloc.get_traced_memory()[0])
            elif sequence % 50 == 0:
                time.sleep(0.01)
    finally:
        tracemalloc.stop()
        for stream in streams:
            stream.socket.shutdown(socket.SHUT_RDWR)
    print([f"{size / 1024:.0f} KiB" for size in sizes])
    assert max(sizes[1:]) - sizes[0] < 1_500_000


def _drain(stream):
    with contextlib.suppress(EOFError, OSError, ValueError):
        while True:
            stream.next()


def test_the_server_needs_no_gnu_radio():
    """In a process of its own: importing and serving loads nothing of GNU Radio's runtime."""
    import subprocess

    code = (
        "import sys; from gnuradio.halfplane.page.server import Server; s = Server(port=0); s.start(); s.publish({}); s.stop();"
        "sys.exit('gnuradio.gr' in sys.modules or 'pmt' in sys.modules)"
    )
    assert subprocess.run([sys.executable, "-c", code], timeout=60).returncode == 0


def test_the_terminal_follows_the_page():
    """`halfplane watch URL --token …` reads what the page offers."""
    import subprocess

    from command import BUILD

    with serving(token=TOKEN) as server:
        server.publish({**FULL, "schema": "halfplane/report/1", "time": "2026-12-01T12:00:00Z"})
        done = subprocess.run([str(BUILD / "halfplane"), "watch", server.url, "--token", TOKEN, "--once"], capture_output=True, text=True, timeout=60)
    assert done.returncode == 0, done.stderr
    assert "firn-12" in done.stdout and "Locked" in done.stdout

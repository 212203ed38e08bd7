# SPDX-License-Identifier: GPL-3.0-or-later
"""The page in Chromium without a window: three sizes, both themes; what stands there is what the report says."""

import json
import re
import time

import pytest
import sample_reports
from drawn import number
from page_server import FULL, TOKEN, serving
from selenium import webdriver
from selenium.webdriver.chrome.service import Service
from selenium.webdriver.common.keys import Keys

from gnuradio.halfplane import views
from gnuradio.halfplane.views import themes, words

PATIENCE = 40.0
FLAGS = (
    "--headless --no-sandbox --disable-gpu --disable-quic --no-first-run --disable-background-networking --disable-component-update "
    "--disable-sync --disable-dev-shm-usage"
)
SIZES = [(360, 740), (1024, 768), (1920, 1080)]
NAMES = [name for name in views.VIEWS if name != "heading"]


@pytest.fixture(scope="module")
def browser(tmp_path_factory):
    options = webdriver.ChromeOptions()
    options.binary_location = "/usr/bin/chromium"
    for flag in (*FLAGS.split(), f"--user-data-dir={tmp_path_factory.mktemp('profile')}"):
        options.add_argument(flag)
    options.set_capability("goog:loggingPrefs", {"browser": "ALL"})
    driver = webdriver.Chrome(service=Service("/usr/bin/chromedriver"), options=options)
    driver.set_page_load_timeout(PATIENCE)
    driver.set_script_timeout(PATIENCE)
    yield driver
    driver.quit()


def look(browser, size, theme):
    """How large the window is, and what the system prefers."""
    width, height = size
    browser.execute_cdp_cmd("Emulation.setDeviceMetricsOverride", {"width": width, "height": height, "deviceScaleFactor": 1, "mobile": width < 500})
    browser.execute_cdp_cmd("Emulation.setEmulatedMedia", {"features": [{"name": "prefers-color-scheme", "value": theme}]})


def wait_for(browser, script, *arguments):
    """The script's value, once it is true."""
    end = time.monotonic() + PATIENCE
    while not (found := browser.execute_script("return " + script, *arguments)):
        assert time.monotonic() < end, script
        time.sleep(0.05)
    return found


def open_page(browser, server, query=""):
    browser.get_log("browser")
    browser.get(server.url + query)
    wait_for(browser, "document.querySelectorAll('figure svg').length === 6 && document.querySelectorAll('#answers li').length === 3")


def texts(browser, name):
    return browser.execute_script("return [...document.querySelectorAll(`#${arguments[0]} svg text`)].map((each) => each.textContent)", name)


def background(browser):
    return browser.execute_script("return getComputedStyle(document.body).backgroundColor")


def rgb(theme):
    ground = themes.THEMES[theme]["ground"]
    return f"rgb({', '.join(str(int(ground[k : k + 2], 16)) for k in (1, 3, 5))})"


@pytest.fixture
def server():
    with serving() as found:
        found.publish(FULL)
        yield found


@pytest.mark.parametrize("theme", ["light", "dark"])
@pytest.mark.parametrize("size", SIZES, ids=str)
def test_every_view_shows_the_reports_numbers(browser, server, size, theme):
    look(browser, size, theme)
    open_page(browser, server)
    shown = browser.execute_script("return [...document.querySelectorAll('#answers li')].map((each) => [each.dataset.state, ...[...each.children].map((part) => part.textContent)])")
    assert shown == [[each.state, each.question, each.answer, each.detail] for each in views.answers(FULL)]
    total, ladder, account = FULL["total"], texts(browser, "ladder"), texts(browser, "account")
    assert words.rate(total["ser"]) in ladder and words.rate(total["ber"]) in ladder
    rates = [number(text) for text in ladder if re.fullmatch(r"[0-9.]+(·10[⁻⁰¹²³⁴⁵⁶⁷⁸⁹]+)?", text)]
    for rung in total["predicted"].values():
        for value in rung.values():
            assert any(abs(rate / value - 1) < 0.006 for rate in rates if rate), value
    assert words.count(total["in"]) in account
    for count in total["excluded"].values():
        assert words.count(count) in account
    assert f"{words.db(FULL['shortfall']['input']['db'])} dB" in texts(browser, "losses")
    # Nothing runs over the edge, letters are large enough to read, colours are the theme's.
    assert browser.execute_script("return document.documentElement.scrollWidth <= innerWidth")
    least = browser.execute_script(
        "return Math.min(...[...document.querySelectorAll('figure svg text')].map((t) => parseFloat(t.getAttribute('font-size')) * t.ownerSVGElement.getBoundingClientRect().width / t.ownerSVGElement.viewBox.baseVal.width))"
    )
    assert least >= 9, least
    assert background(browser) == rgb(theme)
    ink = browser.execute_script("return getComputedStyle(document.querySelector('#ladder svg text[font-weight]')).fill")
    assert ink != "none" and "var" not in ink
    columns = len(set(browser.execute_script("return [...document.querySelectorAll('figure')].map((each) => Math.round(each.getBoundingClientRect().left))")))
    assert columns == {360: 1, 1024: 2, 1920: 3}[size[0]]
    assert browser.get_log("browser") == []  # no error, no breach of the content security policy


def test_the_page_is_live_and_can_be_held_still(browser, server):
    look(browser, (1024, 768), "light")
    open_page(browser, server)
    later = {**FULL, "sequence": 1, "total": {**FULL["total"], "symbol_errors": 987_654}}
    server.publish(later)
    wait_for(browser, "document.getElementById('answers').textContent.includes('987\\u202f654')")
    assert wait_for(browser, "document.getElementById('news').dataset.state") == "live"
    browser.find_element("id", "pause").send_keys(Keys.ENTER)
    server.publish({**FULL, "sequence": 2, "total": {**FULL["total"], "symbol_errors": 111_222}})
    time.sleep(1.0)
    assert "987\u202f654" in browser.find_element("id", "answers").text
    browser.find_element("id", "pause").send_keys(Keys.ENTER)
    wait_for(browser, "document.getElementById('answers').textContent.includes('111\\u202f222')")
    server.publish({**FULL, "sequence": 3, "lock": {"state": "lost"}})
    wait_for(browser, "document.querySelector('#answers [data-state=bad] .answer')?.textContent === 'Lock lost'")
    assert browser.execute_script("return document.getElementById('spoken').textContent") == "Lock lost. Something is wrong."
    server.stop()
    wait_for(browser, "document.getElementById('news').dataset.state === 'lost'")
    server.start()
    wait_for(browser, "document.getElementById('news').dataset.state === 'live'")


def test_colours_by_button_stay_for_the_next_visit(browser, server):
    look(browser, (1024, 768), "light")
    open_page(browser, server)
    for theme, ground in (("light", "light"), ("dark", "dark")):
        browser.find_element("id", "theme").send_keys(Keys.ENTER)
        assert browser.find_element("id", "theme").text == f"Colours: {theme}" and background(browser) == rgb(ground)
    open_page(browser, server)
    assert background(browser) == rgb("dark")
    browser.find_element("id", "theme").send_keys(Keys.ENTER)
    assert background(browser) == rgb("light")


def test_all_is_reached_by_the_keyboard(browser, server):
    look(browser, (1024, 768), "light")
    open_page(browser, server)
    reached = []
    for _ in range(16):
        browser.switch_to.active_element.send_keys(Keys.TAB)
        reached.append(browser.execute_script("const at = document.activeElement; return at.id || at.getAttribute('aria-label') || at.className"))
    assert reached[:4] == ["skip", "pause", "theme", "report"] and {"show-labels", "show-samples"} <= set(reached)
    assert sum(str(each).startswith("Enlarge") for each in reached) == 6
    browser.find_element("css selector", "#curve button").send_keys(Keys.ENTER)
    before = browser.execute_script("return document.querySelector('#losses svg').getBoundingClientRect().width")
    assert browser.execute_script("return document.querySelector('#curve svg').getBoundingClientRect().height") <= 768
    assert browser.execute_script("return document.querySelector('#curve').getBoundingClientRect().width") > 1.8 * before
    named = browser.execute_script("return [...document.querySelectorAll('figure svg')].map((each) => [each.getAttribute('role'), each.querySelector('title').textContent, each.querySelector('desc').textContent])")
    assert all(role == "img" and title and text for role, title, text in named)


def seen(browser, layer):
    """How many elements of a layer take room on the screen."""
    return browser.execute_script(f"return [...document.querySelectorAll('#decision_map .hp-{layer}')].filter((each) => each.getClientRects().length).length")


def test_labels_and_samples_by_the_keyboard(browser, server):
    """Shown and hidden at once, even where the page is held still; no script or style of a drawing has a part in it."""
    server.publish({**FULL, "sequence": 1, "cloud": [0.25 + 0.5j, -0.125 + 0j]})
    look(browser, (1024, 768), "light")
    open_page(browser, server)
    wait_for(browser, "document.querySelector('#decision_map .hp-samples')")
    assert seen(browser, "labels") == 0 and seen(browser, "samples") == 1
    browser.find_element("id", "pause").send_keys(Keys.ENTER)
    browser.find_element("id", "show-labels").send_keys(Keys.ENTER)
    browser.find_element("id", "show-samples").send_keys(Keys.SPACE)
    assert seen(browser, "labels") == 2 * len(FULL["settings"]["labels"]) and seen(browser, "samples") == 0
    pressed = [browser.find_element("id", f"show-{layer}").get_attribute("aria-pressed") for layer in ("labels", "samples")]
    assert pressed == ["true", "false"]
    open_page(browser, server)  # kept for the next visit
    assert seen(browser, "labels") > 0 and seen(browser, "samples") == 0
    browser.execute_script("localStorage.clear()")
    assert browser.get_log("browser") == []


def test_states_differ_without_colour(browser, server):
    """Before each answer stands a sign of its own shape, under achromatopsia as emulated by the browser too."""
    look(browser, (1024, 768), "light")
    browser.execute_cdp_cmd("Emulation.setEmulatedVisionDeficiency", {"type": "achromatopsia"})
    signs = {}
    for state, name in (("held", "good"), ("doubtful", "open"), ("lost", "bad")):
        server.publish({**FULL, "sequence": len(signs) + 1, "lock": {"state": state}})
        open_page(browser, server)
        wait_for(browser, "document.querySelector('#answers li').dataset.state === arguments[0]", name)
        signs[state] = browser.execute_script("return getComputedStyle(document.querySelector('#answers li .answer'), '::before').content")
    browser.execute_cdp_cmd("Emulation.setEmulatedVisionDeficiency", {"type": "none"})
    assert len(set(signs.values())) == 3


@pytest.mark.parametrize("factor", [1.25, 2.0])
def test_scaled(browser, server, factor):
    """At 125 % and 200 % of the system's scaling: the same layout in CSS pixels, nothing over the edge, drawn as vectors."""
    browser.execute_cdp_cmd("Emulation.setDeviceMetricsOverride", {"width": round(1920 / factor), "height": round(1080 / factor), "deviceScaleFactor": factor, "mobile": False})
    open_page(browser, server)
    assert browser.execute_script("return devicePixelRatio") == factor
    assert browser.execute_script("return document.documentElement.scrollWidth <= innerWidth")
    assert browser.execute_script("return document.querySelectorAll('figure svg').length") == 6
    assert browser.execute_script("return document.querySelectorAll('img, canvas').length") == 0


def test_with_a_token_the_page_and_its_stream_work(browser):
    with serving(token=TOKEN, log=__file__) as server:
        server.publish(FULL)
        look(browser, (1024, 768), "light")
        open_page(browser, server, f"?token={TOKEN}")
        report = browser.execute_async_script("const done = arguments[0]; fetch(document.getElementById('report').href).then((r) => r.json()).then(done)")
        assert report == json.loads(json.dumps(FULL))
        assert browser.find_element("id", "log").is_displayed()
        status = browser.execute_async_script("const done = arguments[0]; fetch('report').then((r) => done(r.status))")
        assert status == 401


def test_logs_put_aside_are_offered(browser, tmp_path):
    log = tmp_path / "link.jsonl"
    for number in ("", ".1", ".2"):
        (tmp_path / f"link.jsonl{number}").write_text("{}\n")
    with serving(token=TOKEN, log=str(log)) as server:
        server.publish(FULL)
        look(browser, (1024, 768), "light")
        open_page(browser, server, f"?token={TOKEN}")
        browser.find_element("css selector", "#logs summary").send_keys(Keys.ENTER)
        wait_for(browser, "document.querySelectorAll('#logs a').length === 2")
        found = browser.execute_async_script("const done = arguments[0]; Promise.all([...document.querySelectorAll('#logs a')].map((a) => fetch(a.href).then((r) => [a.textContent, r.status]))).then(done)")
        assert found == [["link.jsonl.1 (3 bytes)", 200], ["link.jsonl.2 (3 bytes)", 200]]
        assert browser.get_log("browser") == []
        assert browser.execute_script("return document.documentElement.scrollWidth <= innerWidth")
    with serving() as server:  # no log, no list
        server.publish(FULL)
        open_page(browser, server)
        assert not browser.find_element("id", "logs").is_displayed()


def test_names_in_a_report_are_words_and_nothing_else(browser, server):
    """A set's name may be anything; it never becomes markup, here or in a drawing."""
    nasty = '<img src=x onerror="document.title=1">"\'&</svg><script>document.title=2</script>'
    report = {**FULL, "sequence": 1, "set": nasty, "pattern": nasty, "losses": [{"cause": nasty, "cost_db": 0.1}], "settings": {**FULL["settings"], "set": nasty}}
    look(browser, (1024, 768), "light")
    server.publish(report)
    open_page(browser, server)
    wait_for(browser, "document.getElementById('set').textContent === arguments[0]", nasty)
    assert browser.execute_script("return document.querySelectorAll('img, body script, svg script').length") == 0
    assert [entry for entry in browser.get_log("browser")] == []


def test_a_page_before_the_first_report_says_so(browser):
    with serving() as server:
        look(browser, (360, 740), "light")
        browser.get(server.url)
        wait_for(browser, "document.getElementById('news').textContent === 'Waiting for the first report'")
        server.publish(sample_reports.searching())
        wait_for(browser, "document.getElementById('answers').textContent.includes('Searching')")


def test_nothing_is_asked_of_another_host(browser, server):
    open_page(browser, server)
    asked = browser.execute_script("return performance.getEntriesByType('resource').map((each) => new URL(each.name).origin)")
    assert len(asked) >= 3 and set(asked) == {server.url.rstrip("/")}

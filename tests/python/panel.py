# SPDX-License-Identifier: GPL-3.0-or-later
"""The panel on Qt's offscreen platform: at three sizes and both themes it shows the report's numbers, by mouse and keyboard."""

import gc
import json
import os
import threading
import time
import tracemalloc

os.environ["QT_QPA_PLATFORM"] = "offscreen"

import numpy as np
import pytest
import sample_reports
from drawn import number
from PyQt5 import QtCore, QtGui, QtTest, QtWidgets
from views import SETTINGS

from gnuradio.halfplane import views
from gnuradio.halfplane.panel.widget import Panel
from gnuradio.halfplane.views import drawing, qt, themes, words
from gnuradio.halfplane.views.pace import Pace

FULL = {**sample_reports.full(), "schema": "halfplane/report/1", "sequence": 0, "settings": SETTINGS, "settings_sha256": "00"}
SIZES = [(360, 700), (1024, 768), (1920, 1080)]
NAMES = [name for name in views.VIEWS if name != "heading"]


@pytest.fixture(scope="session")
def application():
    return QtWidgets.QApplication.instance() or QtWidgets.QApplication([])


@pytest.fixture
def panel(application):
    made = shown(application)
    yield made
    made.close()
    made.deleteLater()
    application.processEvents()


def shown(application, theme="light", size=(1024, 768), report=FULL, **options):
    made = Panel(theme, **options)
    made.resize(*size)
    made.show()
    if report is not None:
        made.publish(report)
    application.processEvents()
    made.draw_all()
    application.processEvents()
    return made


def wait_for(application, condition, patience=20.0):
    end = time.monotonic() + patience
    while not condition():
        assert time.monotonic() < end
        application.processEvents()
        time.sleep(0.01)


def has_colour(image, role, theme, least=30):
    """Whether so many pixels have the colour of a role, as near as smoothed edges leave it."""
    plain = image.convertToFormat(QtGui.QImage.Format_RGB888)
    bits = plain.constBits()
    bits.setsize(plain.sizeInBytes())
    rows = np.frombuffer(bits, np.uint8).reshape(plain.height(), plain.bytesPerLine())[:, : 3 * plain.width()]
    wanted = QtGui.QColor(themes.THEMES[theme][role]).getRgb()[:3]
    return int((np.abs(rows.reshape(-1, 3).astype(int) - wanted).max(axis=1) < 24).sum()) >= least


@pytest.mark.parametrize("theme", ["light", "dark"])
@pytest.mark.parametrize("size", SIZES, ids=str)
def test_every_view_shows_the_reports_numbers(application, size, theme):
    panel = shown(application, theme, size)
    said = {name: panel.canvas(name).drawing.texts() for name in views.VIEWS}
    total = FULL["total"]
    assert words.rate(total["ser"]) in said["ladder"] and words.rate(total["ber"]) in said["ladder"]
    for rung, rates in total["predicted"].items():
        note = next(item.note for item in panel.canvas("ladder").drawing.items if getattr(item, "role", "") == rung and item.note)
        assert abs(number(note.split()[-1]) / rates["ser"] - 1) < 0.006 or abs(number(note.split()[-1]) / rates["ber"] - 1) < 0.006
    for cause, count in total["excluded"].items():
        assert words.count(count) in said["account"]
    assert words.count(total["in"]) in said["account"] and words.count(total["judged"]) in said["account"]
    for each in FULL["losses"]:
        assert f"{'+' if each['cost_db'] >= 0 else ''}{words.db(each['cost_db'])} dB" in said["losses"]
    assert f"{words.db(FULL['shortfall']['input']['db'])} dB" in said["losses"]
    for answer in views.answers(FULL):
        assert set(answer.answer.split()) <= set(" ".join(said["heading"]).split())
    # What is drawn is what was asked to be drawn, as wide as there is room, and none of it beyond the window.
    for name in NAMES:
        canvas = panel.canvas(name)
        assert canvas.drawing.width <= size[0] and abs(canvas.width() - canvas.drawing.width) <= 3
        assert canvas.accessibleName() == canvas.drawing.title and canvas.accessibleDescription() == canvas.drawing.description
        image = canvas.grab().toImage()
        assert has_colour(image, {"history": "measured", "curve": "exact"}.get(name, "ink"), theme, 20), name
        assert image.pixelColor(3, 3) == QtGui.QColor(themes.THEMES[theme]["ground"]), name
    panel.close()


def test_columns_follow_the_width(application):
    for (width, _), columns in zip(SIZES, (1, 2, 3)):
        panel = shown(application, size=(width, 900))
        left = {panel.canvas(name).mapTo(panel, QtCore.QPoint(0, 0)).x() for name in NAMES}
        assert len(left) == columns
        panel.close()


@pytest.mark.parametrize("factor", [1.25, 2.0])
def test_letters_keep_their_size_on_dense_screens(factor):
    """A process of its own: Qt takes the factor once. The logical layout is the same, the picture has more pixels."""
    import subprocess
    import sys

    code = """
import sys; sys.path.insert(0, %r)
import panel as test
application = test.QtWidgets.QApplication([])
shown = test.shown(application)
canvas = shown.canvas("ladder")
image = canvas.grab().toImage()
print(canvas.width(), canvas.drawing.width, image.width(), test.has_colour(image, "measured", "light"))
""" % os.path.dirname(__file__)
    environment = {**os.environ, "QT_SCALE_FACTOR": str(factor), "QT_SCALE_FACTOR_ROUNDING_POLICY": "PassThrough"}
    said = subprocess.run([sys.executable, "-c", code], env=environment, capture_output=True, text=True, timeout=60).stdout.split()
    width, drawn, pixels = map(float, said[:3])
    assert abs(width - drawn) <= 3 and abs(pixels - factor * width) <= 2 and said[3] == "True"


def test_qt_and_svg_draw_the_same_primitives(application):
    """Every kind of primitive leaves ink where it should, in either theme."""
    items = [
        drawing.Line(((10, 10), (90, 10)), "measured", 2, "dash"), drawing.Bar(10, 20, 30, 10, "loss", "ink", hatch=True, round=3),
        drawing.Polygon(((50, 20), (80, 20), (65, 35)), "more"), drawing.Arrow(10, 50, 90, 50, "exact", 4), drawing.Mark(20, 70, "circle", "good", 12),
        drawing.Mark(40, 70, "ring", "bad", 12), drawing.Mark(60, 70, "diamond", "slip", 12), drawing.Mark(80, 70, "cross", "open", 12),
        drawing.Cloud(((15.0, 88.0), (16.0, 88.0)), "nearest", 6, 1.0), drawing.Text(50, 95, "Es/N0", "union", 14, "middle", bold=True, halo=True),
    ]  # fmt: skip
    whole = drawing.Drawing("all", 100, 100, items=items)
    for theme in themes.THEMES:
        image = qt.image(whole, theme, 2.0)
        assert (image.width(), image.height()) == (200, 200)
        for role in ("measured", "more", "exact", "good", "bad", "slip", "open", "nearest", "union", "loss"):
            assert has_colour(image, role, theme, 5), (role, theme)
        assert image.pixelColor(130, 100) == QtGui.QColor(themes.THEMES[theme]["exact"])  # within the arrow's shaft
    middle = qt.image(drawing.Drawing("t", 100, 20, items=[drawing.Text(50, 15, "WWWW", anchor="middle")]), "light", 1)
    dark = [x for x in range(100) if any(middle.pixelColor(x, y).lightness() < 200 for y in range(20))]
    assert abs((dark[0] + dark[-1]) / 2 - 50) <= 1.5


def test_notes_are_shown_where_the_pointer_rests(panel):
    found = panel.canvas("ladder").drawing
    mark = next(item for item in found.items if isinstance(item, drawing.Bar) and item.note.startswith("measured"))
    assert qt.note_at(found, mark.x + mark.width / 2, mark.y + mark.height / 2).startswith("measured")
    assert qt.note_at(found, -50, -50) == ""


def test_keys_zoom_move_and_lead_from_view_to_view(application, panel):
    panel.activateWindow()
    canvas = panel.canvas("decision_map")
    canvas.setFocus()
    whole = canvas._box.viewRect()
    QtTest.QTest.keyClick(canvas, QtCore.Qt.Key_Plus)
    closer = canvas._box.viewRect()
    assert closer.width() < 0.9 * whole.width()
    QtTest.QTest.keyClick(canvas, QtCore.Qt.Key_Right)
    assert canvas._box.viewRect().left() > closer.left()
    panel.publish({**FULL, "sequence": 1})
    panel.draw_all()
    assert canvas._box.viewRect().width() == pytest.approx(closer.width())  # a new report does not throw one back
    QtTest.QTest.keyClick(canvas, QtCore.Qt.Key_0)
    assert canvas._box.viewRect().width() == pytest.approx(whole.width())
    reached, at = set(), panel.canvas("heading")
    for _ in range(300):
        at = at.nextInFocusChain()
        if at.focusPolicy() & QtCore.Qt.TabFocus:
            reached.add(at.objectName() or (at.text() if isinstance(at, QtWidgets.QPushButton) else ""))
    assert {*NAMES, "&Colours", "&Picture", "&Report", "&Labels", "Sa&mples"} <= reached


CLOUD = [0.25 + 0.5j, -0.125 + 0j, complex("nan"), 1e9]


def test_labels_and_samples_by_key_and_by_button(application, panel):
    """The map alone changes; what is off is not drawn."""
    panel.publish({**FULL, "cloud": CLOUD})
    panel.draw_all()

    def shown():
        found = panel.canvas("decision_map").drawing
        dots = [item for item in found.items if isinstance(item, drawing.Cloud)]
        return bool(set(SETTINGS["labels"]) & set(found.texts())), sum(len(each.points) for each in dots)

    assert shown() == (False, 2)  # the two that lie in the frame
    buttons = {each.text(): each for each in panel.findChildren(QtWidgets.QPushButton)}
    QtTest.QTest.keyClick(buttons["&Labels"], QtCore.Qt.Key_Space)
    assert shown() == (True, 2)
    QtTest.QTest.mouseClick(buttons["Sa&mples"], QtCore.Qt.LeftButton)
    assert shown() == (True, 0)
    panel.activateWindow()
    QtTest.QTest.qWaitForWindowActive(panel)
    QtTest.QTest.keyClick(panel, QtCore.Qt.Key_L, QtCore.Qt.ControlModifier)
    wait_for(application, lambda: shown() == (False, 0))
    QtTest.QTest.keyClick(panel, QtCore.Qt.Key_M, QtCore.Qt.ControlModifier)
    wait_for(application, lambda: shown() == (False, 2))
    panel.publish({**FULL, "sequence": 1})  # a window without samples: the old ones are gone
    panel.draw_all()
    assert shown() == (False, 0) and "cloud" not in panel.board.latest()[0]


def test_the_wheel_zooms_with_ctrl_only(panel):
    canvas = panel.canvas("curve")
    whole = canvas._box.viewRect().width()
    at = QtCore.QPointF(100, 100)

    def turn(modifiers):
        event = QtGui.QWheelEvent(at, canvas.mapToGlobal(at.toPoint()), QtCore.QPoint(), QtCore.QPoint(0, 120), QtCore.Qt.NoButton, modifiers, QtCore.Qt.NoScrollPhase, False)
        canvas.wheelEvent(event)
        return event.isAccepted()

    assert not turn(QtCore.Qt.NoModifier) and canvas._box.viewRect().width() == pytest.approx(whole)
    assert turn(QtCore.Qt.ControlModifier) and canvas._box.viewRect().width() < 0.9 * whole


def test_colours_change_all(application, panel):
    button = next(each for each in panel.findChildren(QtWidgets.QPushButton) if "olours" in each.text())
    QtTest.QTest.mouseClick(button, QtCore.Qt.LeftButton)
    assert panel.theme == "dark"
    application.processEvents()
    assert panel.canvas("ladder").grab().toImage().pixelColor(3, 3) == QtGui.QColor(themes.DARK["ground"])
    with pytest.raises(ValueError, match="theme is 'blue'"):
        panel.set_theme("blue")
    with pytest.raises(ValueError, match="theme is 'blue'"):
        Panel("blue")


def test_reports_from_another_thread_are_drawn_the_newest_first(application, panel):
    made = []

    def later(sequence):
        made.append(sequence)
        return {**FULL, "sequence": sequence, "total": {**FULL["total"], "symbol_errors": 1000 + sequence}}

    def publisher():
        for sequence in range(1, 400):
            panel.offer(lambda sequence=sequence: later(sequence))

    thread = threading.Thread(target=publisher)
    thread.start()
    thread.join()
    wait_for(application, lambda: "1\u202f399 errors" in " ".join(panel.canvas("heading").drawing.texts()))
    assert made[-1] == 399 and len(made) < 40  # the others were never read
    panel.offer(lambda: {"total": 3})
    panel.offer(lambda: 1 / 0 if False else None)
    panel.publish({**FULL, "total": {**FULL["total"], "symbol_errors": 4711}})
    wait_for(application, lambda: "4\u202f711 errors" in " ".join(panel.canvas("heading").drawing.texts()))


def test_what_is_saved_is_what_is_shown(application, panel, tmp_path):
    panel.save_picture(str(tmp_path / "link.png"))
    image = QtGui.QImage(str(tmp_path / "link.png"))
    assert image.width() == 2 * 1248 and has_colour(image, "measured", "light")
    panel.save_picture(str(tmp_path / "link.svg"))
    assert words.rate(FULL["total"]["ser"]) in (tmp_path / "link.svg").read_text()
    panel.save_report(str(tmp_path / "link.json"))
    assert json.loads((tmp_path / "link.json").read_text()) == FULL
    panel.save_report(str(tmp_path / "link.html"))
    page = (tmp_path / "link.html").read_text()
    import hashlib

    assert words.rate(FULL["total"]["ser"]) in page
    assert hashlib.sha256((tmp_path / "link.jsonl").read_bytes()).hexdigest() in page
    for wrong in ("link.gif", "link"):
        with pytest.raises(ValueError, match="ends in"):
            panel.save_picture(str(tmp_path / wrong))
        with pytest.raises(ValueError, match="ends in"):
            panel.save_report(str(tmp_path / wrong))
    with pytest.raises(OSError):
        panel.save_report(str(tmp_path / "nowhere" / "link.html"))
    empty = shown(application, report=None)
    with pytest.raises(ValueError, match="no report yet"):
        empty.save_report(str(tmp_path / "empty.html"))


@pytest.mark.parametrize("report", [{}, sample_reports.silent(), sample_reports.searching(), sample_reports.step(18.0)])
def test_reports_that_know_little_are_shown(application, report):
    panel = shown(application, report=report)
    for name in NAMES:
        assert panel.canvas(name).drawing.texts()
    panel.close()


def test_pace_keeps_its_share():
    """Simulated clock: reports all the time, drawings of any cost, and the share holds; none starves."""
    for cost in (1e-4, 3e-3, 0.05, 0.4):
        pace, now, spent, drawn = Pace(NAMES, 0.03), 0.0, 0.0, dict.fromkeys(NAMES, 0)
        while now < 300:
            pace.renew()
            name = pace.due(now)
            if name is None:
                now += max(1e-3, pace.wait(now))
                continue
            drawn[name] += 1
            spent += cost
            now += cost
            pace.spent(name, cost, now)
        assert spent <= 0.03 * now + 0.1 + cost, cost
        assert min(drawn.values()) >= 2, (cost, drawn)
    with pytest.raises(ValueError, match="share is 0"):
        Pace(NAMES, 0)
    assert Pace(NAMES).wait(0.0) is None and Pace(NAMES).due(0.0) is None


def test_memory_is_flat_over_ten_thousand_reports(application, panel):
    sizes = []
    tracemalloc.start()
    try:
        for sequence in range(10_000):
            total = {**FULL["total"], "in": FULL["total"]["in"] + 1000 * sequence}
            panel.publish({**FULL, "sequence": sequence, "total": total})
            if sequence % 400 == 0:
                panel.draw_all()
                application.processEvents()
            if sequence % 3000 == 1500:
                gc.collect()
                sizes.append(tracemalloc.get_traced_memory()[0])
    finally:
        tracemalloc.stop()
    print([f"{size / 1024:.0f} KiB" for size in sizes])
    assert max(sizes[1:]) - sizes[0] < 500_000


def test_greyscale(application):
    """The grabbed widget without its colours: what a state looks like differs by shape, text stands out from the ground."""
    looks = {}
    for state in ("held", "doubtful", "lost"):
        made = shown(application, "light", (1024, 768), {**FULL, "lock": {"state": state}})
        canvas = made.canvas("heading")
        grey = canvas.grab().toImage().convertToFormat(QtGui.QImage.Format_Grayscale8)
        bits = grey.constBits()
        bits.setsize(grey.sizeInBytes())
        levels = np.frombuffer(bits, np.uint8).reshape(grey.height(), grey.bytesPerLine())[:, : grey.width()].astype(int)
        mark = next(item for item in canvas.drawing.items if isinstance(item, drawing.Mark))
        x, y, half = round(mark.x), round(mark.y), 7
        sign = levels[y - half : y + half + 1, x - half : x + half + 1]
        looks[state] = np.abs(sign - sign[0, 0]) > 60  # what differs from the ground
        assert levels.max() - levels.min() > 150
        made.close()
    shapes = [tuple(look.ravel()) for look in looks.values()]
    assert len(set(shapes)) == 3 and all(any(shape) for shape in shapes)

# SPDX-License-Identifier: GPL-3.0-or-later
"""
The example flowgraphs as a user runs them: each .grc compiled by grcc and run, each .py run; the last line they print is
a report, and it says what it must. Radios are replaced by a channel: a gain, a phase, noise, and an end.
"""

import json
import os
import pathlib
import shutil
import socket
import subprocess
import sys

import numpy as np
import pytest
import yaml
from gnuradio import blocks, gr, halfplane
from gnuradio.filter import firdes

SOURCE = pathlib.Path(os.environ["HALFPLANE_SOURCE_DIR"])
FLOWGRAPHS = SOURCE / "examples" / "flowgraphs"
SECONDS = 120  # the longest takes a few
sys.path.insert(0, str(FLOWGRAPHS))


def last_report(command, folder):
    done = subprocess.run([str(part) for part in command], cwd=folder, text=True, timeout=SECONDS, input="",
                          stdout=subprocess.PIPE, stderr=subprocess.PIPE)
    assert done.returncode == 0, done.stderr
    return json.loads(done.stdout.strip().splitlines()[-1])


def compile_grc(path, folder):
    settings = {**os.environ, "GRC_BLOCKS_PATH": str(SOURCE / "grc"), "HOME": str(folder)}
    done = subprocess.run(["grcc", "-o", str(folder), str(path)], text=True, env=settings,
                          stdout=subprocess.PIPE, stderr=subprocess.STDOUT)
    assert done.returncode == 0, done.stdout
    return folder / (path.stem + ".py")


def run_grc(path, folder):
    made = compile_grc(path, folder)
    # What a flowgraph reads by a bare name stands beside it.
    shutil.copy(SOURCE / "examples" / "recordings" / "firn-14db.sigmf-data", folder)
    # Two that run at once shall not want one port.
    with socket.socket() as free:
        free.bind(("127.0.0.1", 0))
        options = ["--page-port", free.getsockname()[1]] if "page_port" in path.read_text() else []
    return last_report([sys.executable, made, *options], folder)


def run_py(path, folder):
    return last_report([sys.executable, path], folder)


def simulated_link(report):
    total = report["total"]
    assert total["judged"] > 0.85 * 100_000 and total["slips"] == 0
    # The receiver costs something, a timing loop that is not wide not much.
    assert report["shortfall"]["input"]["db_low"] < 0.4 and report["shortfall"]["input"]["db_high"] > 0
    assert total["es_n0_db"] > report["input"]["es_n0_db"] - 1


def own_set(report):
    total = report["total"]
    assert report["set"] == "firn-9-quiet" and report["detector"] == "map"
    assert total["judged"] > 195_000 and total["pending"] == 0
    exact = halfplane.predictor(halfplane.load_set(str(SOURCE / "examples" / "sets" / "firn-9-quiet.json"))).ser(10.0)
    # Four standard deviations either way, and what a correction over 2,000 symbols costs: 0.01 dB, 1 % of the rate here.
    assert abs(total["ser"] - exact) < 4 * np.sqrt(exact / total["judged"]) + 0.02 * exact
    # Nearest points would err half as much again: at this Es/N0 priors matter.
    nearest = halfplane.predictor(halfplane.load_set(str(SOURCE / "examples" / "sets" / "firn-9-quiet.json")), detector="ml").ser(10.0)
    assert nearest > total["ser_high"]


def soft_bits(report):
    total = report["total"]
    assert total["bits"] > 400_000 and total["frames"] > 195
    # One bit in thirteen is wrong ahead of the decoder; behind it, with ratios in place of decisions, one in ten thousand.
    assert total["ber_high"] < 1e-3 < halfplane.predictor(halfplane.load_set("qam:16")).ber(9.0) / 50
    assert report["verdict"]["target"] == {"ber": 1e-3} and report["verdict"]["state"] != "fail"


def recording(report):
    total = report["total"]
    assert total["in"] == 40_000 and total["judged"] > 36_000 and total["pending"] == 0 and total["slips"] == 0
    assert report["verdict"]["state"] == "pass"
    assert total["ser_high"] < 0.02


def live_traffic(report):
    """1,000 frames of 64 known symbols and 137 others; the first is cut short. Limits at four standard deviations."""
    total = report["total"]
    decoded, live = total["decoded_part"], total["live_part"]
    assert total["in"] == 1000 * 201 - 77 == total["judged"] + total["decoded"] + total["live"]
    assert total["judged"] == total["symbols"] == 999 * 64 and total["pending"] == 0
    exact = halfplane.predictor(halfplane.load_set("apsk:4+8:2.3")).ser(14.5)
    assert abs(total["ser"] - exact) < 4 * np.sqrt(exact / total["judged"])
    assert abs(total["es_n0_db"] - 14.5) < 4 * total["es_n0_db_se"]
    # Without a code a frame passes if none of its 137 symbols errs; CRC-32 lets one in 2^32 through.
    passed, pass_rate = total["decoded"] // 137, (1 - exact) ** 137
    assert total["decoded"] == 137 * passed and abs(passed - 999 * pass_rate) < 4 * np.sqrt(999 * pass_rate * (1 - pass_rate))
    # So decoded symbols flatter, twice over: no error among them, and less noise than there is.
    assert decoded["symbols"] == total["decoded"] and decoded["symbol_errors"] == 0
    assert decoded["es_n0_db"] > 14.5 + 4 * decoded["es_n0_db_se"]
    # What they have too little, the others have too much: no more than the shares say.
    assert live["symbols"] == total["live"]
    excess = (decoded["es_n0_db"] - 14.5) * total["decoded"] / total["live"]
    assert -excess < live["es_n0_db"] - 14.5 + 4 * live["es_n0_db_se"] and live["es_n0_db"] < 14.5 + 4 * live["es_n0_db_se"]
    assert abs(report["shortfall"]["input"]["db"]) < 0.2


TASKS = {"a_simulated_link": simulated_link, "b_own_set": own_set, "c_soft_bits": soft_bits, "d_recording": recording,
         "e_live_traffic_known_frames": live_traffic}
RADIOS = ["f_over_the_air_uhd", "g_over_the_air_soapy"]


def test_every_flowgraph_stands_twice_and_is_tested():
    names = {path.stem for path in FLOWGRAPHS.glob("*.grc")}
    assert names == {path.stem for path in FLOWGRAPHS.glob("*.py")} == set(TASKS) | set(RADIOS)


@pytest.mark.parametrize("name", TASKS)
@pytest.mark.parametrize("run, suffix", [(run_grc, ".grc"), (run_py, ".py")], ids=["grc", "py"])
def test_says_what_it_must(name, run, suffix, tmp_path):
    TASKS[name](run(FLOWGRAPHS / (name + suffix), tmp_path))


def test_the_simulated_link_serves_a_page_and_wants_no_screen(tmp_path):
    text = compile_grc(FLOWGRAPHS / "a_simulated_link.grc", tmp_path).read_text()
    assert "halfplane.link_page(page_port, '127.0.0.1'" in text and "'report'), (self.page, 'report')" in text
    assert "Qt" not in text and "link_panel" not in text


def test_the_simulated_link_shows_itself_on_a_screen_where_asked(tmp_path):
    """As its note says: the panel enabled, generated for Qt. Made on Qt's offscreen platform, with the link in it."""
    flow = yaml.safe_load((FLOWGRAPHS / "a_simulated_link.grc").read_text())
    flow["options"]["parameters"]["generate_options"] = "qt_gui"
    panel = next(block for block in flow["blocks"] if block["id"] == "halfplane_link_panel")
    assert panel["states"]["state"] == "disabled"
    panel["states"]["state"] = "enabled"
    changed = tmp_path / "a_simulated_link.grc"
    changed.write_text(yaml.safe_dump(flow))
    made = compile_grc(changed, tmp_path)
    code = f"""
import sys; sys.path.insert(0, {str(tmp_path)!r})
from PyQt5 import Qt
application = Qt.QApplication(sys.argv)
import a_simulated_link, time
link = a_simulated_link.a_simulated_link(page_port=0)
link.show()
link.start()
end = time.monotonic() + 60
while link.panel.panel.board.taken < 1 and time.monotonic() < end:
    application.processEvents()
    time.sleep(0.01)
link.stop()
link.wait()
application.processEvents()
print(link.panel.panel.board.latest()[0]["set"], link.panel.isVisible())
"""
    settings = {**os.environ, "QT_QPA_PLATFORM": "offscreen", "HOME": str(tmp_path)}
    done = subprocess.run([sys.executable, "-c", code], cwd=tmp_path, env=settings, capture_output=True, text=True, timeout=SECONDS)
    assert done.stdout.split()[-2:] == ["apsk:4+8:2.3", "True"], done.stderr + made.read_text()[-2000:]


def test_live_traffic_is_the_same_code_in_both():
    """What the .grc carries in its Python blocks stands word for word in the .py."""
    flow = yaml.safe_load((FLOWGRAPHS / "e_live_traffic_known_frames.grc").read_text())
    text = (FLOWGRAPHS / "e_live_traffic_known_frames.py").read_text()
    codes = [block["parameters"][key] for block in flow["blocks"] for key in ("source_code", "_source_code") if key in block["parameters"]]
    assert len(codes) == 2
    for code in codes:
        parts = [part for part in code.split("\n\n\n") if part.startswith(("def ", "class "))]
        assert parts
        for part in parts:
            assert part.rstrip() in text


def over_the_air(report):
    total = report["total"]
    assert total["judged"] > 0.8 * 100_000 and total["slips"] == 0
    assert report["lock"]["state"] == "held"
    assert 12 < total["es_n0_db"] < 16.5  # 16 dB at the input, less what the timing loop leaves


@pytest.mark.parametrize("name", RADIOS)
def test_over_the_air_with_a_channel_in_place_of_the_radio(name, tmp_path):
    """The same flowgraph, its two radio blocks replaced in the .grc, and `permitted` set as a user would set it."""
    flow = yaml.safe_load((FLOWGRAPHS / (name + ".grc")).read_text())
    blocks_of = {block["name"]: block for block in flow["blocks"]}
    assert blocks_of["permitted"]["parameters"]["value"] == "False"
    assert "licensed" in blocks_of["caution"]["parameters"]["note"]
    blocks_of["permitted"]["parameters"]["value"] = "True"
    flow["options"]["parameters"]["run_options"] = "run"
    blocks_of["radio_out"].update(id="blocks_head", parameters={"num_items": "100000 * sps", "type": "complex"})
    blocks_of["radio_in"].update(id="blocks_multiply_const_vxx",
                                 parameters={"const": "0.2 * (0.6 + 0.8j)", "type": "complex", "vlen": "1"})
    # The back-off scales the points: noise for the scaled set, 16 dB.
    flow["blocks"].append({**blocks_of["radio_in"], "name": "air", "id": "halfplane_noise_at", "parameters": {
        "set": "halfplane.signal_set([0.1 * s for s in firn.points], firn.labels)", "es_n0_db": "16", "pulse": "pulse", "seed": "1"}})
    flow["connections"] += [["radio_out", "0", "air", "0"], ["air", "0", "radio_in", "0"]]
    changed = tmp_path / (name + ".grc")
    changed.write_text(yaml.safe_dump(flow))
    over_the_air(run_grc(changed, tmp_path))


@pytest.mark.parametrize("permitted", [True, False])
def test_nothing_is_sent_unless_permitted(permitted):
    from f_over_the_air_uhd import BACK_OFF, AirLink

    which = halfplane.load_set("apsk:4+8:2.3")
    symbols = 100_000 if permitted else 2_000
    head = blocks.head(gr.sizeof_gr_complex, 4 * symbols)
    sent = blocks.vector_sink_c()
    scaled = halfplane.signal_set([BACK_OFF / np.max(np.abs(which.points)) * s for s in which.points], which.labels)
    pulse = firdes.root_raised_cosine(1.0, 4, 1.0, 0.35, 89)
    noise = halfplane.noise_at(scaled, 16.0, pulse, 1)
    link = AirLink(which, "draw:2026", head, noise, 250e3, permitted)
    link.connect(head, noise)
    link.connect(head, sent)
    link.run()
    assert np.any(np.array(sent.data())) == permitted
    if permitted:
        over_the_air(json.loads(link.watch.report()))


@pytest.mark.parametrize("name", RADIOS)
def test_help_carries_the_question_of_permission(name):
    done = subprocess.run([sys.executable, FLOWGRAPHS / (name + ".py"), "--help"], text=True, timeout=SECONDS, stdout=subprocess.PIPE)
    assert done.returncode == 0 and "--permitted" in done.stdout and "licence" in done.stdout

# SPDX-License-Identifier: GPL-3.0-or-later
"""Plots: every format is written, shows what it was given, comes out the same twice, and is refused before work is done."""

import math
import subprocess
import sys
import xml.etree.ElementTree as xml

import matplotlib.image
import numpy as np
import pytest
import sample_reports
from command import FIRN, halfplane, refused
from gnuradio.halfplane import documents, load_set, predictor
from gnuradio.halfplane.plots import curves, link, style


@pytest.fixture(scope="module")
def firn():
    return predictor(load_set(FIRN))


def is_picture(path):
    """Whether a file is a whole picture of its format, and not an empty one."""
    content = path.read_bytes()
    if path.suffix == ".pdf":
        return content.startswith(b"%PDF-") and content.rstrip().endswith(b"%%EOF")
    if path.suffix == ".svg":
        return len(list(xml.fromstring(content).iter("{http://www.w3.org/2000/svg}path"))) > 50
    pixels = matplotlib.image.imread(path)
    return pixels.shape[0] > 400 and np.ptp(pixels[..., :3]) > 0.5


@pytest.mark.parametrize("ending", ["svg", "png", "pdf"])
def test_command_writes(ending, tmp_path):
    path = tmp_path / f"curve.{ending}"
    done = halfplane("curve", FIRN, "--es-n0", "0..18/1", "--plot", path)
    assert done.returncode == 0, done.stderr
    assert done.stdout.splitlines()[-1] == f"written: {path}"
    assert is_picture(path)


def test_json_stays_alone(tmp_path):
    done = halfplane("curve", FIRN, "--es-n0", "3", "--plot", tmp_path / "curve.svg", "--json")
    assert done.stdout.startswith("{") and done.stdout.rstrip().endswith("}")
    assert is_picture(tmp_path / "curve.svg")


def test_refused_before_anything_is_computed(tmp_path):
    # 4,096 points over a thousand values would take minutes.
    text = refused("curve", "qam:4096", "--es-n0", "0..10/0.01", "--plot", tmp_path / "curve.bmp", timeout=20)
    assert ".svg, .png or .pdf" in text


def test_lines_are_the_rates(firn):
    """What stands in the picture is the document: log10 of every rung against Es/N0."""
    document = documents.curve(firn, np.arange(0.0, 20.0))
    _, (axes,) = style.figure(4, 4)
    curves.rungs(axes, document["rows"], "ser")
    drawn = {line.get_label(): line.get_xydata() for line in axes.get_lines()}
    assert len(drawn) == 4
    for rung, look in style.RUNGS.items():
        want = [[row["es_n0_db"], math.log10(row[rung]["ser"])] for row in document["rows"]]
        np.testing.assert_allclose(drawn[look["label"]], want, rtol=1e-12)


def test_rates_below_the_smallest_double_have_a_place(firn, tmp_path):
    curves.draw(documents.curve(firn, [20, 40, 60]), tmp_path / "deep.png")
    assert is_picture(tmp_path / "deep.png")


def test_the_same_input_gives_the_same_bytes(firn, tmp_path):
    document = documents.curve(firn, [0, 5, 10])
    for ending in ("svg", "png", "pdf"):
        first, second = (tmp_path / f"{k}.{ending}" for k in (1, 2))
        curves.draw(document, first)
        curves.draw(document, second)
        assert first.read_bytes() == second.read_bytes()


def test_rungs_differ_without_colour():
    assert len({str(look["linestyle"]) for look in style.RUNGS.values()}) == 4
    # Lightness (CIE L*, sRGB by IEC 61966-2-1) tells the exact curve from each bound in greyscale too.
    light = {name: lightness(look["color"]) for name, look in style.RUNGS.items()}
    assert all(abs(light["exact"] - light[other]) > 20 for other in ("facing", "union", "nearest")), light


def lightness(colour):
    red, green, blue = (int(colour[k : k + 2], 16) / 255 for k in (1, 3, 5))
    linear = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in (red, green, blue)]
    y = 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]
    return 116 * y ** (1 / 3) - 16


@pytest.mark.parametrize("ending", ["svg", "png", "pdf"])
def test_link_plots(firn, ending, tmp_path):
    reports = sample_reports.steps()
    link.draw_points(documents.curve(firn, np.arange(6, 20, 0.5)), reports, tmp_path / f"points.{ending}")
    link.draw_shortfall(reports, tmp_path / f"shortfall.{ending}")
    assert is_picture(tmp_path / f"points.{ending}") and is_picture(tmp_path / f"shortfall.{ending}")


def test_link_plots_without_errors_or_shortfall(firn, tmp_path):
    """A run that counted nothing leaves upper ends and says that there is no shortfall, and does not fail."""
    reports = [sample_reports.silent()]
    link.draw_points(documents.curve(firn, [10, 12]), reports, tmp_path / "points.svg")
    link.draw_shortfall(reports, tmp_path / "shortfall.png")
    assert is_picture(tmp_path / "points.svg") and is_picture(tmp_path / "shortfall.png")


def test_commands_load_neither_matplotlib_nor_the_host():
    code = (
        "import sys; from gnuradio.halfplane.cli import curve, inspect, sets;"
        "print('matplotlib' in sys.modules, 'gnuradio.gr' in sys.modules)"
    )
    assert subprocess.run([sys.executable, "-c", code], capture_output=True, text=True).stdout == "False False\n"

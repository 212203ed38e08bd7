# SPDX-License-Identifier: GPL-3.0-or-later
"""Reference pages: one for each block and command, with every parameter and option, built by Sphinx without a warning."""

import html
import os
import pathlib
import re
import subprocess
import sys

import pytest
import yaml
from gnuradio.halfplane import cli

SOURCE = pathlib.Path(os.environ["HALFPLANE_SOURCE_DIR"])
REFERENCE = SOURCE / "python" / "reference"


@pytest.fixture(scope="module")
def pages(tmp_path_factory):
    folder = tmp_path_factory.mktemp("reference")
    settings = {**os.environ, "QT_QPA_PLATFORM": "offscreen"}
    for command in (
        [REFERENCE / "make_pages.py", SOURCE / "grc", folder / "rst"],
        ["-m", "sphinx", "-q", "-W", "-b", "html", "-c", REFERENCE, folder / "rst", folder / "html"],
    ):
        done = subprocess.run([sys.executable, *map(str, command)], env=settings, capture_output=True, text=True)
        assert done.returncode == 0, done.stdout + done.stderr
    return folder / "html"


def text_of(page):
    return html.unescape(re.sub(r"<[^>]+>", "", page.read_text()))


@pytest.mark.parametrize("path", sorted((SOURCE / "grc").glob("*.block.yml")), ids=lambda path: path.name.split(".")[0])
def test_every_block_has_a_page_with_its_parameters(pages, path):
    description = yaml.safe_load(path.read_text())
    page = text_of(pages / ("block_" + description["id"].replace("halfplane_", "", 1) + ".html"))
    assert description["label"] in page and "Wiring:" in page
    for parameter in description.get("parameters", []):
        assert parameter["id"] in page


@pytest.mark.parametrize("name", cli.halfplane.list_commands(None))
def test_every_command_has_a_page_with_its_options(pages, name):
    page = text_of(pages / f"command_{name}.html")
    for parameter in cli.halfplane.get_command(None, name).params:
        assert parameter.opts[0] in page or (parameter.metavar or parameter.human_readable_name.upper()) in page


def test_the_core_and_the_index(pages):
    core = text_of(pages / "core.html")
    for text in ("es_n0_db_for_ser", "capacity_gap_db", "displaced_among", "with_natural_labels"):
        assert text in core
    index = (pages / "index.html").read_text()
    assert "block_link_watch.html" in index and "command_curve.html" in index

# SPDX-License-Identifier: GPL-3.0-or-later
"""
GNU Radio Companion: every block of ours loads, the examples have no unknown block or parameter, validate, are compiled by
grcc and run; C++ generation of a small flowgraph compiles against the installed module and runs.
"""

import json
import os
import pathlib
import shutil
import subprocess
import sys

import pytest
import yaml
from gnuradio import gr
from gnuradio.grc.core.platform import Platform

SOURCE = pathlib.Path(os.environ["HALFPLANE_SOURCE_DIR"])
BUILD = pathlib.Path(os.environ["HALFPLANE_BINARY_DIR"])
FLOWGRAPHS = sorted((SOURCE / "examples").rglob("*.grc"))
OURS = sorted((SOURCE / "grc").glob("*.block.yml"))
SMALL = SOURCE / "tests" / "blocks" / "small.grc"
IN_PYTHON = {"halfplane_link_page", "halfplane_link_panel"}  # blocks that a flowgraph in C++ cannot have


@pytest.fixture(scope="module")
def platform():
    made = Platform(version=gr.version(), version_parts=(gr.major_version(), gr.api_version(), gr.minor_version()),
                    prefs=gr.prefs())
    made.build_library([str(SOURCE / "grc"), "/usr/share/gnuradio/grc/blocks"])
    return made


def assert_valid(platform, path):
    data = yaml.safe_load(path.read_text())
    assert data["metadata"]["file_format"] == 1
    graph = platform.make_flow_graph(str(path))
    graph.rewrite()
    graph.validate()
    assert not [block.name for block in graph.blocks if block.is_dummy_block]
    for block in graph.blocks:
        given = next((b["parameters"] for b in data["blocks"] if b["name"] == block.name), {})
        assert set(given) <= set(block.params), f"{block.name}: unknown parameters"
    assert graph.is_valid(), list(graph.iter_error_messages())


def test_every_block_file_loads(platform):
    keys = {yaml.safe_load(path.read_text())["id"] for path in OURS}
    assert len(keys) == len(OURS) and keys <= set(platform.blocks)
    named = yaml.safe_load((SOURCE / "grc" / "halfplane.tree.yml").read_text())
    listed = {key for group in named["[Halfplane]"] for keys in group.values() for key in keys}
    assert listed == keys
    for key in keys:
        block = platform.blocks[key]
        assert "Wiring:" in block.documentation[""], key
        assert "python" in block.flags, key
        assert "cpp" in block.flags or key in IN_PYTHON, key


def test_every_block_file_is_installed():
    text = (SOURCE / "grc" / "CMakeLists.txt").read_text()
    assert [path.name for path in OURS if path.name not in text] == []


@pytest.mark.parametrize("path", FLOWGRAPHS + [SMALL], ids=lambda path: path.name)
def test_flowgraphs_validate(platform, path):
    assert_valid(platform, path)


def grcc(path, folder):
    settings = {**os.environ, "GRC_BLOCKS_PATH": str(SOURCE / "grc"), "HOME": str(folder)}
    done = subprocess.run(["grcc", "-o", str(folder), str(path)], text=True, env=settings,
                          stdout=subprocess.PIPE, stderr=subprocess.STDOUT)
    assert done.returncode == 0, done.stdout


def test_a_set_shows_its_energy_and_closest_distance(platform):
    graph = platform.make_flow_graph(str(SMALL))
    variable = next(block for block in graph.blocks if block.key == "variable_halfplane_signal_set")
    for text, shown in (("psk:8", "Set: 8 points, Es 1, closest 0.7654 apart"), ("psk:-8", "Set: not one yet")):
        variable.params["value"].set_value(text)
        graph.rewrite()
        assert variable.params["value"].name == shown


def test_cpp_generation_compiles_and_runs(tmp_path):
    prefix = tmp_path / "prefix"
    build = tmp_path / "build"
    clean = {k: v for k, v in os.environ.items() if k not in ("PYTHONPATH", "LD_LIBRARY_PATH")}

    def run(*command, **where):
        done = subprocess.run([str(part) for part in command], text=True, env=clean,
                              stdout=subprocess.PIPE, stderr=subprocess.STDOUT, **where)
        assert done.returncode == 0, done.stdout
        return done.stdout

    run("cmake", "--install", BUILD, "--prefix", prefix)
    grcc(SMALL, tmp_path)
    run("cmake", "-S", tmp_path / "small", "-B", build, f"-DCMAKE_PREFIX_PATH={prefix}", "-DCMAKE_CXX_FLAGS=-O0",
        f"-DCMAKE_CXX_COMPILER_LAUNCHER={shutil.which('ccache') or ''}")
    run("cmake", "--build", build)
    run(build / "small", cwd=tmp_path)
    final = json.loads((tmp_path / "small.jsonl").read_text().splitlines()[-1])
    assert final["final"] and final["total"]["in"] == 50000 and final["total"]["judged"] > 40000
    assert final["input"]["es_n0_db"] == 12.0

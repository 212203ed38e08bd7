# SPDX-License-Identifier: GPL-3.0-or-later
"""The module installed in a prefix of its own: a consumer project builds and runs, the package imports."""

import os
import pathlib
import shutil
import subprocess
import sys

import pytest

SOURCE = pathlib.Path(os.environ["HALFPLANE_SOURCE_DIR"])
BUILD = pathlib.Path(os.environ["HALFPLANE_BINARY_DIR"])
PROJECT = SOURCE / "tests" / "consumer" / "project"
WITH_BLOCKS = (BUILD / "lib" / "blocks").is_dir()


def run(*command, **settings):
    """Output of a command that must succeed, with nothing of the build tree on any search path."""
    clean = {k: v for k, v in os.environ.items() if k not in ("PYTHONPATH", "LD_LIBRARY_PATH")}
    done = subprocess.run([str(part) for part in command], text=True, stdout=subprocess.PIPE, stderr=subprocess.STDOUT,
                          env={**clean, **settings})
    assert done.returncode == 0, done.stdout
    return done.stdout


@pytest.fixture(scope="module")
def prefix():
    folder = BUILD / "tests" / "consumer" / "prefix"
    shutil.rmtree(folder, ignore_errors=True)
    run("cmake", "--install", BUILD, "--prefix", folder)
    return folder


@pytest.fixture(scope="module", params=["core", "blocks"] if WITH_BLOCKS else ["core"])
def consumer(request, prefix):
    """A consumer project, built against the installed tree."""
    folder = BUILD / "tests" / "consumer" / request.param
    shutil.rmtree(folder, ignore_errors=True)
    run("cmake", "-S", PROJECT, "-B", folder, f"-DCMAKE_PREFIX_PATH={prefix}",
        f"-DCORE_ONLY={'ON' if request.param == 'core' else 'OFF'}")
    run("cmake", "--build", folder)
    return folder, request.param


def test_consumer_builds_and_runs(consumer):
    folder, components = consumer
    assert run(folder / "energy") == "es 5\n"
    if components == "blocks":
        assert run(folder / "send") == "4 samples\n"


def package_root(prefix):
    """The folder that holds the installed gnuradio/halfplane."""
    found = list(prefix.glob("lib*/python3*/*/gnuradio/halfplane/__init__.py"))
    assert len(found) == 1, found
    return found[0].parents[2]


def test_installed_package_stands_beside_gnu_radio(prefix):
    root = package_root(prefix)
    assert not (root / "gnuradio" / "__init__.py").exists()


def test_installed_package_imports(prefix):
    names = "halfplane.signal_set" + (", halfplane.point_mapper" if WITH_BLOCKS else "")
    out = run(sys.executable, "-c", f"from gnuradio import halfplane; print(halfplane.__file__); {names}",
              PYTHONPATH=str(package_root(prefix)))
    assert out.startswith(str(prefix))


def test_installed_libraries_find_each_other(prefix):
    """No entry of the build tree or of this machine in the libraries' search path."""
    libraries = [path for path in prefix.rglob("*.so*") if not path.is_symlink()]
    assert libraries
    for path in libraries:
        assert str(BUILD / "lib") not in run("readelf", "-d", path)
        assert "not found" not in run("ldd", path)

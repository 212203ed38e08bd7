# SPDX-License-Identifier: GPL-3.0-or-later
"""The command line from the build tree, run as a user runs it."""

import json
import os
import subprocess
from pathlib import Path

SOURCE = Path(os.environ["HALFPLANE_SOURCE_DIR"])
BUILD = Path(os.environ["HALFPLANE_BINARY_DIR"])
FIRN = str(SOURCE / "examples" / "sets" / "firn-12.json")


def halfplane(*arguments, timeout=120, cwd=None):
    """Runs build/halfplane → the finished process, with text in stdout and stderr."""
    # Without PYTHONPATH: the launcher must find its package by itself.
    environment = {key: value for key, value in os.environ.items() if key != "PYTHONPATH"}
    return subprocess.run(
        [str(BUILD / "halfplane"), *map(str, arguments)],
        capture_output=True, text=True, timeout=timeout, env=environment, cwd=cwd,
    )  # fmt: skip


def document(*arguments, **options):
    """The one JSON document that a command prints; fails where anything else is printed or NaN, Inf or null stand in it."""
    done = halfplane(*arguments, "--json", **options)
    assert done.returncode == 0, done.stderr
    assert done.stderr == ""

    def refuse(word):
        raise AssertionError(f"{word} stands in the document")

    parsed = json.loads(done.stdout, parse_constant=refuse)
    assert not _has_null(parsed), "null stands in the document"
    return parsed


def _has_null(value):
    if isinstance(value, dict):
        return any(map(_has_null, value.values()))
    if isinstance(value, list):
        return any(map(_has_null, value))
    return value is None


def refused(*arguments, **options):
    """What a refused command says: one line on stderr, nothing on stdout, exit code 2."""
    done = halfplane(*arguments, **options)
    assert done.returncode == 2, (done.returncode, done.stdout, done.stderr)
    assert done.stdout == ""
    assert done.stderr.count("\n") == 1 and done.stderr.endswith("\n"), done.stderr
    assert "Traceback" not in done.stderr
    return done.stderr.strip()

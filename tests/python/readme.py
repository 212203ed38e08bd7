# SPDX-License-Identifier: GPL-3.0-or-later
"""Every `build/halfplane …` in the README's console blocks runs, and prints what the README shows."""

import re
import shlex
import subprocess

from command import BUILD, SOURCE


def examples(text):
    """(command line, lines shown) of each `$ ` line within ```console blocks."""
    for block in re.findall(r"^```console\n(.*?)^```", text, re.M | re.S):
        for part in re.split(r"^\$ ", block, flags=re.M)[1:]:
            line, _, shown = part.partition("\n")
            yield line, [each.rstrip() for each in shown.splitlines()]


def test_examples_are_found():
    text = "x\n```console\n$ a b\n1\n2\n$ c\n```\n```sh\n$ no\n```\n"
    assert list(examples(text)) == [("a b", ["1", "2"]), ("c", [])]


def test_readme_shows_what_is_printed(tmp_path):
    readme = SOURCE / "README.md"
    for line, shown in examples(readme.read_text() if readme.exists() else ""):
        words = shlex.split(line)
        if words[0] != "build/halfplane":
            continue
        words = [str(SOURCE / word) if word.startswith("examples/") else word for word in words[1:]]
        done = subprocess.run([str(BUILD / "halfplane"), *words], capture_output=True, text=True, cwd=tmp_path)
        assert done.returncode == 0, (line, done.stderr)
        printed = [each.rstrip() for each in done.stdout.splitlines()]
        # A line "…" stands for any lines; a speed is not the same twice.
        pattern = "\n".join(r"(?:.*\n)*?.*" if each == "…" else re.escape(each) for each in shown)
        pattern = re.sub(r"\d+(?:\\\.\d+)?\\ million", r"[0-9.]+\\ million", pattern)
        if shown:
            assert re.fullmatch(pattern, "\n".join(printed)), (line, printed)

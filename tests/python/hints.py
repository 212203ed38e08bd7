# SPDX-License-Identifier: GPL-3.0-or-later
"""Type hints: every public name of the modules stands in them with its parameters, and mypy takes what users write."""

import ast
import importlib
import inspect
import pathlib
import subprocess
import sys

import pytest
from gnuradio import halfplane

PACKAGE = pathlib.Path(halfplane.core_python.__file__).parent
MODULES = ["core_python"] + (["blocks_python"] if (PACKAGE / "blocks_python.pyi").exists() else [])


def hinted(module):
    """{name: {parameter names}} and {class: {member: …}} as the hints have them."""
    found = {}
    for node in ast.parse((PACKAGE / f"{module}.pyi").read_text()).body:
        if isinstance(node, ast.FunctionDef):
            found[node.name] = {a.arg for a in [*node.args.args, *node.args.kwonlyargs]}
        elif isinstance(node, ast.ClassDef):
            found[node.name] = {
                member.name: {a.arg for a in [*member.args.args, *member.args.kwonlyargs]}
                for member in node.body if isinstance(member, ast.FunctionDef)
            }  # fmt: skip
        elif isinstance(node, ast.AnnAssign):
            found[node.target.id] = None
    return found


@pytest.mark.parametrize("name", MODULES)
def test_every_public_name_is_hinted_and_no_other(name):
    module = importlib.import_module(f"gnuradio.halfplane.{name}")
    hints = hinted(name)
    public = {key for key, value in vars(module).items() if not key.startswith("_") and not inspect.ismodule(value)}
    assert public == set(hints)
    for key in public:
        kind = getattr(module, key)
        if inspect.isclass(kind):
            members = {m for m in vars(kind) if not m.startswith("_")}
            assert members == {m for m in hints[key] if not m.startswith("_")}, key
            for member in members - {"__init__"}:
                assert "None" not in str(hints[key][member]) and inspect.getdoc(getattr(kind, member)) is not None, (key, member)


def test_parameters_are_those_of_the_module():
    hints = hinted("core_python")
    assert hints["predictor"]["ser"] == {"self", "es_n0_db", "rung"}
    assert hints["predictor"]["__init__"] == {"self", "set", "law", "detector", "noise"}
    assert hints["plan"] == {"target", "confidence", "trials_per_symbol", "symbol_rate", "dispersion", "allowed"}


GOOD = """
import numpy as np
from gnuradio import halfplane

firn = halfplane.load_set("psk:8")
one: float = halfplane.predictor(firn, "rician:6").ser(10.0)
many = halfplane.predictor(firn).ber(np.arange(3.0))
print(many.sum() + one, firn.points.mean(), firn.label_strings[0].upper())
"""
BAD = {
    "halfplane.predictor(3)": "arg-type",
    "halfplane.load_set('psk:8').size.upper()": "attr-defined",
    "halfplane.predictor(halfplane.load_set('psk:8')).ser()": "call-overload",
}


def test_mypy_takes_what_users_write_and_refuses_what_would_fail(tmp_path):
    (tmp_path / "good.py").write_text(GOOD)
    (tmp_path / "bad.py").write_text("from gnuradio import halfplane\n" + "\n".join(BAD) + "\n")
    # The host's own packages have no hints; ours lie beside them under one name.
    (tmp_path / "gnuradio").symlink_to(PACKAGE.parent)
    command = [sys.executable, "-m", "mypy", "--namespace-packages", "--explicit-package-bases", "--follow-imports=silent", "good.py", "bad.py"]
    done = subprocess.run(command, cwd=tmp_path, capture_output=True, text=True)
    for number, code in enumerate(BAD.values(), 2):
        assert any(line.startswith(f"bad.py:{number}: error") and f"[{code}]" in line for line in done.stdout.splitlines()), done.stdout
    assert "good.py" not in done.stdout, done.stdout

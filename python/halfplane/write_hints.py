# SPDX-License-Identifier: GPL-3.0-or-later
"""
Writes the type hints (.pyi) of an extension module from the signatures that the module itself gives.

    python3 write_hints.py MODULE FILE        e.g. gnuradio.halfplane.core_python …/core_python.pyi

Where the module takes an array and gives back a number or an array of its shape, two overloads say so.
"""

import importlib
import inspect
import re
import sys

HEAD = '''"""Type hints of {module}, written when it was built."""

from typing import Any, Callable, Dict, List, Optional, Set, Tuple, Union, overload

import numpy as np
import numpy.typing as npt
'''
_SIGNATURE = re.compile(r"(?:\d+\. )?(\w+)\((.*)\) -> (.+)")
_ARRAY = re.compile(r"numpy\.ndarray\[numpy\.(\w+)\]")


def _split(text):
    """At commas that stand outside brackets and quotes."""
    parts, depth, quote, current = [], 0, "", ""
    for c in text:
        if quote:
            quote = "" if c == quote else quote
        elif c in "'\"":
            quote = c
        elif c in "([{<":
            depth += 1
        elif c in ")]}>":
            depth -= 1
        if c == "," and not depth and not quote:
            parts.append(current.strip())
            current = ""
        else:
            current += c
    return [*parts, current.strip()] if current.strip() else parts


class Module:
    """The hints of one module, line by line."""

    def __init__(self, module):
        self.module = module
        self.lines = []

    @staticmethod
    def own(text):
        return re.sub(r"gnuradio\.halfplane\.\w+_python\.", "", text)

    def given(self, kind):
        """Type of a parameter."""
        kind = _ARRAY.sub("npt.ArrayLike", self.own(kind))
        return {"object": "Any", "function": "Callable[..., Any]"}.get(kind, self.known(kind))

    def returned(self, kind):
        kind = _ARRAY.sub(lambda found: f"npt.NDArray[np.{found[1]}]", self.own(kind))
        return {"dict": "Dict[str, Any]", "list": "List[Any]", "tuple": "Tuple[Any, ...]"}.get(kind, self.known(kind))

    @staticmethod
    def known(kind):
        """What the host's modules name is not described here."""
        return "Any" if re.search(r"gnuradio\.|gr::|pmt|std::", kind) else kind

    def parameter(self, text, kind=None):
        """`name: type = value` as a hint has it: any default becomes an ellipsis."""
        if text in ("*", "/") or ":" not in text:
            return "*args: Any" if text.startswith("*args") else "**kwargs: Any" if text.startswith("**") else text
        name, rest = text.split(":", 1)
        found, equals, _ = rest.partition("=")
        kind = kind or self.given(found.strip())
        if equals and "None" in rest.partition("=")[2] and kind != "Any":
            kind = f"Optional[{kind}]"
        return f"{name}: {kind}" + (" = ..." if equals else "")

    def function(self, doc, name, indent="", is_static=False):
        signatures = [s for s in map(_SIGNATURE.fullmatch, (doc or "").splitlines()) if s and s[1] in (name, "__init__")]
        if len(signatures) > 1 and signatures[0][2] == "*args, **kwargs":
            signatures = signatures[1:]
        lines = []
        for found in signatures:
            parameters, result = _split(found[2]), found[3].strip()
            if parameters and parameters[0].startswith(("self:", "arg0:")) and indent and not is_static:
                parameters = ["self", *parameters[1:]]
            array = next((k for k, p in enumerate(parameters) if "numpy.ndarray" in p), None)
            if result == "object" and array is not None:
                for number in (True, False):
                    shown = [
                        self.parameter(p, "float") if number and "numpy.ndarray" in p else self.parameter(p) for p in parameters
                    ]  # fmt: skip
                    lines.append((shown, "float" if number else "npt.NDArray[np.float64]"))
            else:
                lines.append(([self.parameter(p) for p in parameters], self.returned(result)))
        for shown, result in lines:
            if is_static:
                self.lines.append(indent + "@staticmethod")
            if len(lines) > 1:
                self.lines.append(indent + "@overload")
            text = ", ".join(shown)
            # Every float is an array to numpy, so the two overloads overlap; the first one wins, as it should.
            overlap = "  # type: ignore" if len(lines) > 1 else ""
            self.lines.append(f"{indent}def {name}({text}) -> {result}: ...{overlap}")
        return bool(lines)

    def class_of(self, name, kind):
        # Blocks derive from classes of the host that have no hints.
        host = [b for b in kind.__mro__ if b.__module__.startswith("gnuradio.gr")]
        bases = ["Any"] if host else [b.__name__ for b in kind.__bases__ if b is ValueError]
        self.lines += ["", "", f"class {name}{'(' + ', '.join(bases) + ')' if bases else ''}:"]
        before = len(self.lines)
        for member, value in sorted(vars(kind).items()):
            if isinstance(value, property):
                found = re.match(r".*-> (.+)", value.fget.__doc__ or "")
                self.lines += ["    @property", f"    def {member}(self) -> {self.returned(found[1].strip()) if found else 'Any'}: ..."]
            elif isinstance(value, staticmethod):
                self.function(value.__func__.__doc__, member, "    ", is_static=True)
            elif callable(value) and (not member.startswith("__") or member in ("__init__", "__len__")):
                self.function(value.__doc__, member, "    ")
        if len(self.lines) == before:
            self.lines.append("    ...")

    def text(self):
        for name, value in sorted(vars(self.module).items()):
            if name.startswith("_"):
                continue
            if inspect.isclass(value):
                self.class_of(name, value)
            elif callable(value):
                self.function(value.__doc__, name)
            elif not inspect.ismodule(value):
                self.lines.append(f"{name}: {type(value).__name__}")
        head = HEAD.format(module=self.module.__name__)
        if not hasattr(self.module, "signal_set"):
            head += "\nfrom .core_python import signal_set\n"
        return head + "\n" + "\n".join(self.lines) + "\n"


if __name__ == "__main__":
    hints = Module(importlib.import_module(sys.argv[1])).text()
    with open(sys.argv[2], "w", encoding="utf-8") as out:
        out.write(hints)

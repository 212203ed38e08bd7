# SPDX-License-Identifier: GPL-3.0-or-later
"""
Writes one page a block, a command and a topic of the Python API, for Sphinx, from what stands in the code: docstrings, the
blocks' GRC files, the commands' help.

    python3 make_pages.py GRC_FOLDER OUT_FOLDER
"""

import importlib
import inspect
import re
import sys
from pathlib import Path

import click
import yaml
from gnuradio import halfplane
from gnuradio.halfplane import cli


def title(text, line="="):
    return f"{text}\n{line * len(text)}\n\n"


def literal(text):
    return "::\n\n" + "\n".join("    " + line if line else "" for line in text.rstrip().splitlines()) + "\n\n"


def signature(doc, name):
    """The call as the docstring's first line has it, in the package's own names, and what follows it."""
    first, _, rest = (doc or "").partition("\n")
    if not first.startswith((name + "(", "__init__(")):
        return "", doc or ""
    call = re.sub(r"gnuradio\.halfplane\.\w+\.", "", first).replace("__init__(self: ", "(self: ")
    call = re.sub(r"\(self: \w+(, )?", "(", call).replace(" -> None", "")
    return (call if call.startswith(name) else name + call), rest.strip()


def block_page(key, description):
    """A block of the companion, and its class in Python where it has one."""
    name = key.replace("halfplane_", "", 1)
    out = title(f"{description['label']} — ``{name}``")
    kind = None if key.startswith("variable_") else getattr(halfplane, name)
    if kind is not None:
        call, _ = signature(kind.__init__.__doc__, name) if not inspect.isfunction(kind.__init__) else ("", "")
        out += literal(call or f"{name}{inspect.signature(kind)}") + title("In Python", "-") + literal(inspect.getdoc(kind) or "")
        for member in sorted(vars(kind)):
            value = getattr(kind, member)
            if callable(value) and not member.startswith("_") and value.__doc__:
                call, text = signature(inspect.getdoc(value), member)
                out += literal(f"{call or member}\n\n{text}".rstrip())
    out += title("In the companion", "-")
    rows = [(p["id"], p.get("label", p["id"]), p.get("default", "")) for p in description.get("parameters", [])]
    if rows:
        out += ".. list-table::\n   :header-rows: 1\n\n   * - parameter\n     - shown as\n     - default\n"
        for row in rows:
            cells = [str(cell).strip() if cell not in ("", None) else "—" for cell in row]
            out += "".join(f"   {'*' if k == 0 else ' '} - ``{cell}``\n" for k, cell in enumerate(cells))
        out += "\n"
    return out + literal(description.get("documentation", ""))


def command_page(name):
    command = cli.halfplane.get_command(None, name)
    context = click.Context(command, info_name=f"halfplane {name}", max_content_width=100)
    return title(f"``halfplane {name}``") + literal(command.get_help(context))


def api_page():
    """Everything else that the package offers, by name."""
    out = title("The core in Python") + "``from gnuradio import halfplane``; Es/N0 in dB, numbers or arrays of any shape.\n\n"
    core = importlib.import_module("gnuradio.halfplane.core_python")
    for name, value in sorted(vars(core).items()):
        if name.startswith("_") or not callable(value):
            continue
        out += title(f"``{name}``", "-")
        if not inspect.isclass(value):
            call, text = signature(inspect.getdoc(value), name)
            out += literal(f"{call or name}\n\n{text}".rstrip())
            continue
        call, _ = signature(value.__init__.__doc__, name)
        out += literal(f"{call or name}\n\n{inspect.getdoc(value) or ''}".rstrip())
        for member, inner in sorted(vars(value).items()):
            if member.startswith("_"):
                continue
            if isinstance(inner, property):
                kind = re.sub(r".*-> ", "", (inner.fget.__doc__ or "").splitlines()[0]) if inner.fget.__doc__ else ""
                text = inspect.getdoc(inner) or ""
                out += literal(f"{member}: {re.sub(r'gnuradio.halfplane.[a-z_]+[.]', '', kind)}\n\n{text}".rstrip())
            else:
                call, text = signature(inspect.getdoc(getattr(value, member)), member)
                out += literal(f"{call or member}\n\n{text}".rstrip())
    return out


def toctree(caption, names):
    return f".. toctree::\n   :caption: {caption}\n   :maxdepth: 1\n\n" + "".join(f"   {name}\n" for name in names) + "\n"


def write_all(grc, out):
    out.mkdir(parents=True, exist_ok=True)
    blocks = {}
    for path in sorted(grc.glob("*.block.yml")):
        description = yaml.safe_load(path.read_text())
        name = "block_" + description["id"].replace("halfplane_", "", 1)
        blocks[name] = block_page(description["id"], description)
    commands = {"command_" + name: command_page(name) for name in cli.halfplane.list_commands(None)}
    pages = {**blocks, **commands, "core": api_page()}
    pages["index"] = (
        title("gr-halfplane") + f"Version {halfplane.core_python.__version__}. Written from the code when it was built.\n\n"
        + toctree("Blocks", blocks) + toctree("Commands", commands) + toctree("Python", ["core"])
    )  # fmt: skip
    for name, text in pages.items():
        (out / f"{name}.rst").write_text(text, encoding="utf-8")
    return pages


if __name__ == "__main__":
    write_all(Path(sys.argv[1]), Path(sys.argv[2]))

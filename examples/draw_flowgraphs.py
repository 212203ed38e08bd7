# SPDX-License-Identifier: GPL-3.0-or-later
"""
Draws every example flowgraph into a picture, by the companion's own drawing code.

    xvfb-run -a python3 examples/draw_flowgraphs.py FOLDER

Needs Debian's gir1.2-gtk-3.0, python3-gi-cairo and xvfb, and the module where Python finds it.
"""

import os
import sys
from pathlib import Path

import gi

gi.require_version("Gtk", "3.0")
gi.require_version("PangoCairo", "1.0")
gi.require_foreign("cairo", "Context")

from gi.repository import GLib  # noqa: E402
from gnuradio import gr  # noqa: E402
from gnuradio.grc.gui.Platform import Platform  # noqa: E402, I001 (first: it breaks a circle of imports)
from gnuradio.grc.gui import Utils  # noqa: E402
from gnuradio.grc.gui.Application import Application  # noqa: E402

HERE = Path(__file__).resolve().parent
GRAPHS = HERE / "flowgraphs"
PATIENCE_MS = 30_000


def draw_all(folder):
    """Opens all flowgraphs in one window of the companion, draws each, and closes it."""
    platform = Platform(
        version=gr.version(),
        version_parts=(gr.major_version(), gr.api_version(), gr.minor_version()),
        prefs=gr.prefs(),
        install_prefix=gr.prefix(),
    )
    platform.build_library([str(HERE.parent / "grc"), os.path.join(gr.prefix(), "share/gnuradio/grc/blocks")])
    paths = sorted(GRAPHS.glob("*.grc"))
    companion = Application([str(path) for path in paths], platform)
    drawn = []

    def draw():
        pages = {Path(page.file_path): page.flow_graph for page in companion.main_window.get_pages() if page.file_path}
        if not set(paths) <= set(pages):
            return True  # still opening: asked again
        for path in paths:
            graph = pages[path]
            graph.update()
            if not graph.is_valid():
                print(path.name, *graph.iter_error_messages(), file=sys.stderr)
                break
            drawn.append(folder / (path.stem + ".png"))
            Utils.make_screenshot(graph, str(drawn[-1]))
        companion.quit()
        return False

    GLib.timeout_add(200, draw)
    GLib.timeout_add(PATIENCE_MS, companion.quit)
    companion.run()
    print(*drawn, sep="\n")
    return len(drawn) == len(paths)


if __name__ == "__main__":
    sys.exit(not draw_all(Path(sys.argv[1] if len(sys.argv) > 1 else ".")))

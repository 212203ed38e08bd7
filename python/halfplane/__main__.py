# SPDX-License-Identifier: GPL-3.0-or-later
"""The command line, as `python3 -m gnuradio.halfplane`."""

from .cli import run

run()

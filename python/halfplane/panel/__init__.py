# SPDX-License-Identifier: GPL-3.0-or-later
"""The link on the screen of a Qt flowgraph: widget.Panel takes reports, without GNU Radio; link_panel is its block."""

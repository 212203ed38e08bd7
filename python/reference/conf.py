# SPDX-License-Identifier: GPL-3.0-or-later
"""Sphinx: how the reference pages look. make_pages.py writes what they say."""

project = "gr-halfplane"
author = "gr-halfplane"
html_theme = "alabaster"
html_theme_options = {"description": "What the constellation permits, and what the receiver does", "page_width": "1000px"}
html_copy_source = False
highlight_language = "none"

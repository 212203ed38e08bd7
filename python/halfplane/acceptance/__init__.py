# SPDX-License-Identifier: GPL-3.0-or-later
"""The acceptance report of a link: its document (document.py), and that document as a page to read or print (page.py)."""

# SPDX-License-Identifier: GPL-3.0-or-later
"""A live page of a link over HTTP, usable without GNU Radio: server.Server takes reports as they come. link_page is its block."""

# SPDX-License-Identifier: GPL-3.0-or-later
"""`halfplane sets`: the constellations that have names."""

import json

import click

from .. import core_python as core
from .. import documents
from . import arguments, shown


@click.command("sets")
@click.argument("name", required=False)
@arguments.json_option
def command(name, as_json):
    """List the named constellations, or print the points and labels of one (JSON: a set file)."""
    if name is None:
        _list(as_json)
    else:
        _show(core.load_set(name), as_json)


def _list(as_json):
    entries = core.named_sets()
    if as_json:
        click.echo(documents.dumps([{"name": e.name, "about": e.about, "source": e.source} for e in entries]))
        return
    out = shown.console()
    listing = shown.table("name", "about", "source")
    for column in listing.columns:
        column.justify = "left"
        column.no_wrap = column is listing.columns[0]
    for entry in entries:
        listing.add_row(entry.name, entry.about, entry.source)
    out.print(listing)


def _show(signal_set, as_json):
    if as_json:
        click.echo(json.dumps(documents.set_file(signal_set), indent=1, allow_nan=False))
        return
    out = shown.console()
    listing = shown.table("index", "label", "i", "q", *(() if signal_set.uniform else ("p",)), title=f"{signal_set.name}, {signal_set.size} points")
    for k, (point, label, prior) in enumerate(zip(signal_set.points, signal_set.label_strings, signal_set.priors)):
        cells = [str(k), label, f"{point.real:.6f}", f"{point.imag:.6f}"]
        listing.add_row(*cells, *(() if signal_set.uniform else (f"{prior:.6f}",)))
    out.print(listing)
    if signal_set.note:
        out.print(signal_set.note, style=shown.QUIET)

# SPDX-License-Identifier: GPL-3.0-or-later
"""`halfplane sets`: the constellations that have names."""

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
        _show(name, as_json)


def _list(as_json):
    entries = core.named_sets()
    if as_json:
        click.echo(documents.dumps([{"name": e.name, "about": e.about, "source": e.source} for e in entries]))
        return
    listing = shown.table("name", "about", "source")
    for column in listing.columns:
        column.justify = "left"
        column.no_wrap = column is listing.columns[0]
    for entry in entries:
        listing.add_row(entry.name, entry.about, entry.source)
    shown.show(listing)


def _show(what, as_json):
    signal_set = core.load_set(what)
    if as_json:
        click.echo(core.set_json(signal_set), nl=False)
        return
    head = ("index", "label", "i", "q") if signal_set.uniform else ("index", "label", "i", "q", "p")
    listing = shown.table(*head, title=f"{signal_set.name or what}, {signal_set.size} points")
    for k, (point, label, prior) in enumerate(zip(signal_set.points, signal_set.label_strings, signal_set.priors)):
        cells = (str(k), label, f"{point.real:.6f}", f"{point.imag:.6f}", f"{prior:.6f}")
        listing.add_row(*cells[: len(head)])
    shown.show(listing, *([shown.quiet(signal_set.note)] if signal_set.note else []))

# SPDX-License-Identifier: GPL-3.0-or-later
"""`halfplane curve`: every rung against Es/N0, as a table, JSON, CSV or plot."""

import csv

import click

from .. import core_python as core
from .. import documents
from . import arguments, shown


@click.command("curve")
@arguments.set_argument
@arguments.range_options
@arguments.law_option
@arguments.detector_option
@click.option("--plot", type=click.Path(dir_okay=False, writable=True), metavar="FILE", help="Draw the curves: .svg, .png or .pdf.")
@click.option("--csv", "csv_file", type=click.Path(dir_okay=False, writable=True), metavar="FILE", help="Write the rows as CSV.")
@arguments.json_option
def command(what, es_n0, eb_n0, law, detector, plot, csv_file, as_json):
    """Error rates of SET against Es/N0: exact, facing and union bound, nearest-neighbour approximation."""
    if plot:
        from ..plots import check_format

        check_format(plot)
    signal_set = core.load_set(what)
    predictor = core.predictor(signal_set, law, detector or "automatic")
    document = documents.curve(predictor, arguments.es_n0_values(signal_set, es_n0, eb_n0))
    if csv_file:
        _write_csv(csv_file, document)
    if plot:
        from ..plots import curves

        curves.draw(document, plot)
    if as_json:
        click.echo(documents.dumps(document))
        return
    written = [shown.quiet(f"written: {path}") for path in (plot, csv_file) if path]
    shown.show(_table(document), *written)


def _table(document):
    facts = document["set"]
    name = facts.get("name", "a set without a name")
    title = f"{name}: {facts['size']} points, {document['law']}, {document['detector']} detector"
    rows = document["rows"]
    headings = {"mi": ("MI bit", ".4f"), "mi_gap_db": ("gap dB", ".2f"), "bmd_rate": ("BMD bit", ".4f")}
    known = [key for key in headings if any(key in row.get("information", {}) for row in rows)]
    result = shown.table(
        "Es/N0 dB", "Eb/N0 dB", ("SER exact", shown.STRONG), "≤ facing", "≤ union", "≈ nearest",
        ("BER exact", shown.STRONG), "≤ union", *(headings[key][0] for key in known), title=title,
    )  # fmt: skip
    for row in rows:
        cells = [shown.db(row["es_n0_db"]), shown.db(row["eb_n0_db"])]
        for rung, kind in (("exact", "ser"), ("facing", "ser"), ("union", "ser"), ("nearest", "ser"), ("exact", "ber"), ("union", "ber")):
            cells.append(shown.rate(row[rung].get(kind), row[rung]["ln_" + kind]))
        carried = row.get("information", {})
        cells += [format(carried[key], headings[key][1]) if key in carried else "" for key in known]
        result.add_row(*cells)
    return result


def _write_csv(path, document):
    """One line a row; an empty field where a rate is below the smallest double (its logarithm stands)."""
    kinds = ("ser", "ber", "ln_ser", "ln_ber", "ber_if_gray")
    columns = ["es_n0_db", "eb_n0_db", "mi", "mi_gap_db", "bmd_rate", "bmd_gap_db"]
    columns += [f"{rung}_{kind}" for rung in documents.RUNGS for kind in kinds]
    with open(path, "w", newline="", encoding="utf-8") as stream:
        out = csv.DictWriter(stream, columns, restval="", lineterminator="\n")
        out.writeheader()
        for row in document["rows"]:
            line = {"es_n0_db": row["es_n0_db"], "eb_n0_db": row["eb_n0_db"], **row.get("information", {})}
            for rung in documents.RUNGS:
                line.update({f"{rung}_{kind}": row[rung][kind] for kind in kinds if kind in row[rung]})
            out.writerow({key: repr(value) for key, value in line.items()})

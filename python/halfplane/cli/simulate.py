# SPDX-License-Identifier: GPL-3.0-or-later
"""`halfplane simulate`: errors counted in seeded noise, beside the exact rate."""

import math
import os
import sys

import click
from rich.progress import BarColumn, Progress, TextColumn, TimeRemainingColumn

from .. import core_python as core
from .. import documents
from . import arguments, shown


@click.command("simulate")
@arguments.set_argument
@arguments.range_options
@arguments.law_option
@arguments.detector_option
@click.option("--errors", type=arguments.Count(), default=200, show_default=True, help="Stop an Es/N0 at so many symbol errors.")
@click.option("--max-symbols", type=arguments.Count(), default=10**9, show_default=True, help="Stop it at so many symbols.")
@click.option("--seed", type=click.IntRange(0, 2**64 - 1), default=1, show_default=True, help="The same seed counts the same errors.")
@click.option("--rare", is_flag=True, help="Estimate by importance sampling, for rates that counting never reaches.")
@arguments.json_option
def command(what, es_n0, eb_n0, law, detector, errors, max_symbols, seed, rare, as_json):
    """Count errors of SET in seeded noise. Ctrl-C ends the run and keeps what was counted."""
    signal_set = core.load_set(what)
    predictor = core.predictor(signal_set, law, detector or "automatic")
    values = arguments.es_n0_values(signal_set, es_n0, eb_n0)
    options = {"law": law, "detector": predictor.detector, "seed": seed, "max_symbols": max_symbols}
    rows, symbols, seconds, stopped = [], 0, 0.0, False
    # The bar goes to stderr: stdout holds the result alone.
    console = shown.console(sys.stderr if sys.stderr.isatty() else open(os.devnull, "w"))
    columns = (TextColumn("{task.description}"), BarColumn(), TextColumn("{task.percentage:3.0f} %"), TimeRemainingColumn())
    with Progress(*columns, console=console, transient=True) as bar:
        for value in values:
            task = bar.add_task(f"{shown.db(value)} dB", total=1.0)

            def show(fraction, *counts, task=task):
                bar.update(task, completed=fraction)

            if rare:
                relative = min(0.99, 1 / math.sqrt(errors))
                result = core.simulate_rare(signal_set, value, relative_error=relative, progress=show, **options)
                done, drawn = not result["cancelled"], result["symbols"]
                row = documents.rare_row(predictor, value, result) if done else None
            else:
                result = core.simulate(signal_set, value, errors=errors, progress=show, **options)
                drawn = result["counts"].symbols
                row = documents.counted_row(predictor, value, result["counts"])
            if row is not None and drawn:
                rows.append(row)
            symbols, seconds = symbols + drawn, seconds + result["seconds"]
            bar.remove_task(task)
            stopped = result["interrupted"]
            if stopped:
                break
    document = {
        "set": documents.inspect(signal_set), "seed": seed, "law": predictor.law, "detector": predictor.detector,
        "method": "importance sampling" if rare else "counting",
        "symbols_per_second": symbols / seconds if seconds > 0 else 0.0, "rows": rows,
    }  # fmt: skip
    if stopped:
        print("halfplane simulate: interrupted; what was counted follows", file=sys.stderr)
    if as_json:
        click.echo(documents.dumps(document))
    else:
        shown.show(_table(document), shown.quiet(f"{document['symbols_per_second'] / 1e6:.1f} million symbols a second"))
    return 130 if stopped else 0


def _table(document):
    name = document["set"].get("name", "a set without a name")
    title = f"{name}, {document['law']}, {document['detector']} detector, seed {document['seed']}, {document['method']}"
    result = shown.table(
        "Es/N0 dB", "Eb/N0 dB", "symbols", "errors", ("SER", shown.STRONG), "95 % interval", ("exact", shown.STRONG), "z",
        ("BER", shown.STRONG), "exact", title=title,
    )  # fmt: skip
    for row in document["rows"]:
        result.add_row(
            shown.db(row["es_n0_db"]), shown.db(row["eb_n0_db"]), shown.count(row["symbols"]),
            shown.count(row["symbol_errors"]) if "symbol_errors" in row else "–",
            shown.rate(row["ser"]), shown.span(row.get("ser_low"), row["ser_high"]), shown.rate(row["exact"].get("ser")),
            f"{row['z']:+.2f}" if "z" in row else "–", shown.rate(row["ber"]), shown.rate(row["exact"].get("ber")),
        )  # fmt: skip
    return result

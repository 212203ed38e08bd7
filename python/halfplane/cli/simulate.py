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
@click.option("--errors", type=arguments.Count(), help="Stop an Es/N0 at so many symbol errors.  [default: 200; none with --width]")
@click.option("--max-symbols", type=arguments.Count(), default=10**9, show_default=True, help="Stop it at so many symbols.")
@click.option("--seed", type=click.IntRange(0, 2**64 - 1), default=1, show_default=True, help="The same seed counts the same errors.")
@click.option("--rare", is_flag=True, help="Estimate by importance sampling, for rates that counting never reaches.")
@click.option("--width", type=arguments.Positive("RATIO"), help="Stop it when the 95 % interval is narrower than RATIO times the SER.")
@click.option("--rotation", type=float, default=0.0, metavar="DEG", help="Turn the received points, counter-clockwise.")
@click.option("--gain-imbalance", type=float, default=0.0, metavar="DB", help="In-phase over quadrature amplitude.")
@click.option("--phase-imbalance", type=float, default=0.0, metavar="DEG", help="What the two axes miss of the right angle.")
@click.option("--offset", type=complex, default=0.0, metavar="Z", help="Move the received points, as 0.02+0.01j.")
@click.option("--saturation", type=float, default=0.0, metavar="A", help="Amplitude that a compressing amplifier approaches (Rapp); 0: none.")
@click.option("--smoothness", type=float, default=2.0, show_default=True, metavar="P", help="Rapp's p of that amplifier.")
@click.option("--plot", type=click.Path(dir_okay=False, writable=True), metavar="FILE", help="Draw counts over the curves: .svg, .png or .pdf.")
@arguments.json_option
def command(what, es_n0, eb_n0, law, detector, errors, max_symbols, seed, rare, width, plot, as_json, **disturbance):
    """
    Count errors of SET in seeded noise. Ctrl-C ends the run and keeps what was counted.

    The detector knows nothing of rotation, imbalance, offset and compression; the exact rate does, the other rungs do not.
    """
    if rare and width:
        raise click.UsageError("--width does not go with --rare, whose error is set by --errors N: 1/sqrt(N)")
    if plot:
        from ..plots import check_format

        check_format(plot)
    if errors is None:
        errors = 0 if width else 200
    signal_set = core.load_set(what)
    means = _means(signal_set, **disturbance)
    predictor = core.predictor(signal_set, law, detector or "automatic")
    values = arguments.es_n0_values(signal_set, es_n0, eb_n0)
    options = {"law": law, "detector": predictor.detector, "seed": seed, "max_symbols": max_symbols, "means": means}
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
                row = documents.rare_row(predictor, value, result, means) if done else None
            else:
                result = core.simulate(signal_set, value, errors=errors, relative_width=width or 0.0, progress=show, **options)
                drawn = result["counts"].symbols
                row = documents.counted_row(predictor, value, result["counts"], means=means)
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
    if means is not None:
        document["means"] = [[z.real, z.imag] for z in means.tolist()]
    if plot and rows:
        from ..plots import simulated

        simulated.draw(document, documents.curve(predictor, simulated.span(rows)), plot)
    if stopped:
        print("halfplane simulate: interrupted; what was counted follows", file=sys.stderr)
    if as_json:
        click.echo(documents.dumps(document))
    else:
        notes = [f"{document['symbols_per_second'] / 1e6:.1f} million symbols a second"]
        if rare:
            notes.append("simulated by importance sampling, no errors were counted; the interval is 1.96 standard errors")
        if means is not None:
            notes.append("exact: with points moved; facing, union and nearest: without")
        if plot and rows:
            notes.append(f"written: {plot}")
        shown.show(_table(document), "", _rungs(document), *(shown.quiet(note) for note in notes))
    return 130 if stopped else 0


def _means(signal_set, rotation, gain_imbalance, phase_imbalance, offset, saturation, smoothness):
    """Where the points arrive; None where nothing moves them."""
    if not (rotation or gain_imbalance or phase_imbalance or offset or saturation):
        return None
    return core.displaced_points(
        signal_set, rotation=math.radians(rotation), gain_imbalance_db=gain_imbalance,
        phase_imbalance=math.radians(phase_imbalance), offset=offset, saturation=saturation, compression_smoothness=smoothness,
    )  # fmt: skip


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


def _rungs(document):
    result = shown.table("Es/N0 dB", ("exact", shown.STRONG), "facing", "union", "nearest", title="predicted SER by rung")
    for row in document["rows"]:
        result.add_row(shown.db(row["es_n0_db"]), *(shown.rate(row[rung].get("ser")) for rung in ("exact", "facing", "union", "nearest")))
    return result

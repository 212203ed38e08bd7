# SPDX-License-Identifier: GPL-3.0-or-later
"""`halfplane inspect`: the facts of a constellation, for people or as JSON."""

import math

import click
from rich.text import Text

from .. import core_python as core
from .. import documents
from . import arguments, shown

# Beyond these the listing says how many more there are; --json has them all.
MOST_DISTANCES = 8
MOST_POINTS_DRAWN = 256


@click.command("inspect")
@arguments.set_argument
@click.option(
    "--tolerance",
    type=float,
    default=core.default_tolerance,
    show_default=True,
    help="Take distances, edges and symmetries as equal within this times the smallest distance.",
)
@arguments.json_option
def command(what, tolerance, as_json):
    """Facts about SET: energies, distances, facing points, symmetries, Gray or not."""
    signal_set = core.load_set(what)
    facts = documents.inspect(signal_set, tolerance)
    if as_json:
        click.echo(documents.dumps(facts))
        return
    parts = [_summary(signal_set, facts), Text(), _distances(facts)]
    if signal_set.size <= MOST_POINTS_DRAWN:
        parts += [Text(), *drawing(signal_set)]
    if signal_set.note:
        parts += [Text(), shown.quiet(signal_set.note)]
    shown.show(*parts)


def _summary(signal_set, facts):
    gray = "yes" if facts["gray"] else "among the closest points only" if facts["gray_among_closest"] else "no"
    mean = complex(facts["mean_i"], facts["mean_q"])
    return shown.facts(
        [
            ("points", facts["size"]),
            ("label", f"{facts['label_bits']} bits"),
            ("priors", "equal" if signal_set.uniform else f"{min(signal_set.priors):.4g} … {max(signal_set.priors):.4g}"),
            ("entropy H", f"{facts['entropy_bits']:.4f} bits a symbol"),
            ("Es", f"{facts['es']:.6g}"),
            ("Eb = Es/H", f"{facts['eb']:.6g}"),
            ("mean", "0" if abs(mean) < 1e-9 * math.sqrt(facts["es"]) else f"{mean.real:.4g} {mean.imag:+.4g}j"),
            ("peak over mean power", f"{shown.db(facts['papr_db'])} dB"),
            ("smallest distance", f"{facts['d_min']:.6g}"),
            ("closest neighbours", f"{facts['mean_closest']:.4g} on average"),
            ("facing points", f"{facts['mean_facing']:.4g} on average, {facts['facing_bit_distance']:.4g} bits apart"),
            ("Gray", gray),
            ("symmetries", f"{facts['rotations']} rotations, {facts['mirrors']} mirrors"),
        ],
        title=facts.get("name", "a set without a name"),
    )


def _distances(facts):
    result = shown.table("distance", "in d_min", "ordered pairs")
    for each in facts["distances"][:MOST_DISTANCES]:
        result.add_row(f"{each['d']:.6g}", f"{each['d'] / facts['d_min']:.4f}", shown.count(each["pairs"]))
    more = len(facts["distances"]) - MOST_DISTANCES
    if more > 0:
        result.add_row("…", "", f"{more} more distances")
    return result


def drawing(signal_set, height=21):
    """The points in their plane: each as its label where the labels have room, else as a dot."""
    points = signal_set.points
    reach = max(abs(points.real).max(), abs(points.imag).max())
    half = height // 2
    rows = [round(half - half * y / reach) for y in points.imag]
    columns = [round(2 * half + 2 * half * x / reach) for x in points.real]  # a character is twice as high as wide
    for marks in (signal_set.label_strings, ["●"] * signal_set.size):
        lines = _placed(marks, rows, columns, height, 4 * half + 1)
        if lines is not None:
            break
    else:
        return
    axis = [" "] * len(lines[half])
    for k, line in enumerate(lines):
        if k == half:
            line[:] = [mark if mark != " " else "─" for mark in line]
        middle = len(axis) // 2
        if line[middle] in " ─":
            line[middle] = "┼" if k == half else "│"
        text = Text("".join(line).rstrip())
        text.highlight_regex("[─│┼]", shown.QUIET)
        yield text


def _placed(marks, rows, columns, height, width):
    """Lines of characters with each mark centred on its place; None where two would touch."""
    margin = len(marks[0]) // 2 + 1
    lines = [[" "] * (width + 2 * margin) for _ in range(height)]
    for mark, row, column in zip(marks, rows, columns):
        start = margin + column - (len(mark) - 1) // 2
        around = lines[row][max(0, start - 1) : start + len(mark) + 1] if len(mark) > 1 else lines[row][start]
        if any(c != " " for c in around):
            return None
        lines[row][start : start + len(mark)] = mark
    return lines

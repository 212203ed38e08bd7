# SPDX-License-Identifier: GPL-3.0-or-later
"""`halfplane plan`: how many symbols a test of an error rate takes, and how likely a link is to pass it."""

import math

import click

from .. import core_python as core
from .. import documents
from . import arguments, shown


@click.command("plan")
@arguments.target_options
@click.option("--confidence", type=arguments.Probability(), default=0.95, show_default=True, help="That a link at the target fails.")
@click.option("--symbol-rate", type=arguments.Positive("HZ"), help="Symbols a second; adds the time.")
@click.option("--bits-per-symbol", type=arguments.Count(), default=1, show_default=True, help="Bits that a symbol carries, for --ber.")
@arguments.json_option
def command(ser, ber, confidence, symbol_rate, bits_per_symbol, as_json):
    """The shortest tests that show an error rate below a target: one for each number of errors still allowed."""
    kind = arguments.one_of(ser, "--ser", ber, "--ber")[2:]
    if kind == "ser" and bits_per_symbol != 1:
        raise click.UsageError("--bits-per-symbol goes with --ber", click.get_current_context())
    rows = core.plan(
        ser if kind == "ser" else ber, confidence=confidence, trials_per_symbol=bits_per_symbol, symbol_rate=symbol_rate or 0
    )  # fmt: skip
    document = {"target": {kind: ser if kind == "ser" else ber}, "confidence": confidence}
    if kind == "ber":
        document["bits_per_symbol"] = bits_per_symbol
    if symbol_rate:
        document["symbol_rate"] = symbol_rate
    document["rows"] = rows
    if as_json:
        click.echo(documents.dumps(document))
        return
    timed = ("time",) if symbol_rate else ()
    unit = "symbols" if kind == "ser" else "bits"
    head = ("errors allowed", unit, *(() if kind == "ser" else ("symbols",)), *timed, "half pass at", f"{100 * confidence:g} % pass at")
    title = f"{kind.upper()} below {shown.rate(document['target'][kind])} with confidence {confidence:g}"
    table = shown.table(*head, title=title)
    for row in rows:
        symbols = () if kind == "ser" else (shown.count(math.ceil(row["symbols"])),)
        time = (_duration(row["seconds"]),) if symbol_rate else ()
        rates = (shown.rate(row["rate_half_pass"]), shown.rate(row["rate_usually_pass"]))
        table.add_row(str(row["allowed_errors"]), shown.count(row["trials"]), *symbols, *time, *rates)
    shown.show(table, shown.quiet("errors that come several at a time need longer tests than independent ones"))


def _duration(seconds):
    for unit, length in (("d", 86400), ("h", 3600), ("min", 60)):
        if seconds >= 2 * length:
            return f"{seconds / length:.3g} {unit}"
    return f"{seconds:.3g} s"

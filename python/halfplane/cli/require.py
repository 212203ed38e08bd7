# SPDX-License-Identifier: GPL-3.0-or-later
"""`halfplane require`: the Es/N0 that a target error rate needs."""

import click

from .. import core_python as core
from .. import documents
from . import arguments, shown


@click.command("require")
@arguments.set_argument
@arguments.target_options
@click.option("--rung", type=click.Choice(documents.RUNGS), default="exact", show_default=True, help="Which predicted figure.")
@arguments.law_option
@arguments.detector_option
@arguments.json_option
def command(what, ser, ber, rung, law, detector, as_json):
    """The Es/N0 beyond which SET stays at or below a target error rate."""
    kind = arguments.one_of(ser, "--ser", ber, "--ber")[2:]
    signal_set = core.load_set(what)
    predictor = core.predictor(signal_set, law, detector or "automatic")
    document = documents.require(predictor, kind, ser if kind == "ser" else ber, rung)
    if as_json:
        click.echo(documents.dumps(document))
        return
    target = document["target"][kind]
    shown.show(
        shown.facts(
            [
                ("target", f"{kind.upper()} {shown.rate(target)}, {rung} rung, {document['law']}, {document['detector']} detector"),
                ("Es/N0", f"{shown.db(document['es_n0_db'], 4)} dB"),
                ("Eb/N0", f"{shown.db(document['eb_n0_db'], 4)} dB"),
                ("above Shannon's limit for H", f"{shown.db(document['shannon_gap_db'], 4)} dB"),
            ],
            title=signal_set.name or what,
        )
    )

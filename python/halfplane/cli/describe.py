# SPDX-License-Identifier: GPL-3.0-or-later
"""`halfplane describe`: SigMF metadata beside a file of samples."""

import click

from .. import core_python as core
from .. import recordings
from . import DONE, arguments


@click.command("describe")
@click.argument("file", type=click.Path(exists=True, dir_okay=False), metavar="FILE")
@click.option("--format", "datatype", default="cf32_le", show_default=True, metavar="FORMAT", help=f"Of the samples: {', '.join(core.sample_formats())}.")
@click.option("--symbol-rate", type=arguments.Positive("HZ"), help="One sample a symbol: the sample rate is the symbol rate.")
@click.option("--datetime", "moment", metavar="UTC", help="Of the first sample, as 2026-12-01T06:30:00Z.")
@click.option("--frequency", type=float, metavar="HZ", help="The radio was tuned to.")
@click.option("--description", metavar="TEXT", help="What was recorded.")
@click.option("--author", metavar="TEXT", help="Who recorded it.")
@click.option("--set", "what", metavar="SET", help="The set that was sent: judge then needs no --set.")
@click.option("--pattern", metavar="PATTERN", help="The pattern that was sent: judge then needs no --pattern.")
@click.option("--digest", is_flag=True, help="With the SHA-512 of FILE; judge verifies it.")
@click.option("--replace", is_flag=True, help="Overwrite metadata that are there.")
def command(file, datatype, symbol_rate, moment, frequency, description, author, what, pattern, digest, replace):
    """Write SigMF metadata beside FILE, samples such as a file sink writes them.

    NAME.sigmf-data gets NAME.sigmf-meta; any other file keeps its name, which the metadata then says.
    """
    written = recordings.write_meta(
        file, datatype, symbol_rate, datetime=moment, frequency=frequency, description=description, author=author,
        set=what, pattern=pattern, digest=digest, replace=replace,
    )  # fmt: skip
    click.echo(f"written: {written}")
    return DONE

# SPDX-License-Identifier: GPL-3.0-or-later
"""`halfplane report`: an acceptance report from logs, to read, to print, or as a document."""

from pathlib import Path

import click

from .. import documents
from . import DONE, FAILED, UNDECIDED, arguments, shown

FORMATS = (".html", ".pdf")
_CODES = {"pass": DONE, "fail": FAILED, "undecided": UNDECIDED}

@click.command("report")
@click.argument("logs", nargs=-1, required=True, type=click.Path(exists=True, dir_okay=False), metavar="LOG…")
@click.option("--out", type=click.Path(dir_okay=False, writable=True), metavar="FILE", help="Write the report: .html or .pdf.")
@click.option("--job", metavar="TEXT", help="What was measured, for whom: the report's title.")
@click.option(
    "--against", type=click.Path(exists=True, dir_okay=False), metavar="BASELINE.json",
    help="Set a stored report (its --json) beside this one, point by point.",
)  # fmt: skip
@click.option("--theme", type=click.Choice(["light", "dark", "system"]), default="light", show_default=True, help="Of the .html; paper is always light.")
@arguments.json_option
def command(logs, out, job, against, theme, as_json):
    """Acceptance report of the link in LOG, a log of reports as link_log writes it.

    Each run in the logs is one point. With several, one verdict each and one in all: failed where one failed, passed
    where all did. Without a target in the logs there is no verdict.
    """
    if not out and not as_json:
        raise click.UsageError("nothing to write: give --out FILE, or --json")
    if out:
        _check(out)
    from ..acceptance import document as acceptance
    from ..views import source

    read = source.read(logs)
    document = acceptance.of_logs(read, job)
    if against:
        acceptance.set_against(document, against)
    if out:
        _write(out, document, read.trace, theme)
    if as_json:
        click.echo(documents.dumps(document))
    else:
        _say(document, out)
    return _CODES.get(document.get("verdict"), DONE)

def _check(out):
    if Path(out).suffix.lower() not in FORMATS:
        raise ValueError(f"{out}: a report ends in {' or '.join(FORMATS)}")
    if not Path(out).resolve().parent.is_dir():
        raise ValueError(f"{out}: there is no folder {Path(out).resolve().parent}")

def _write(out, document, trace, theme):
    from ..acceptance import page

    if Path(out).suffix.lower() == ".html":
        Path(out).write_text(page.html(document, trace, theme), encoding="utf-8")
        return
    from ..acceptance import pdf

    pdf.write(page.html(document, trace, for_print=True), out)

def _say(document, out):
    from .. import live

    reports = [point["report"] for point in document["points"]]
    said = {"pass": "passed", "fail": "failed", "undecided": "undecided"}.get(document.get("verdict"), "no target, no verdict")
    shown.show(live.steps_table(reports), shown.quiet(f"{said}; written: {out}"))

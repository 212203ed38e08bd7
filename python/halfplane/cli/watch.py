# SPDX-License-Identifier: GPL-3.0-or-later
"""`halfplane watch`: a running link in a terminal, from its log or its page."""

import sys
import time

import click

from . import DONE, shown

POLL_SECONDS = 0.5


@click.command("watch")
@click.argument("what", metavar="LOG|URL")
@click.option("--once", is_flag=True, help="Show what is known now and end.")
@click.option("--token", default="", metavar="TEXT", help="Of a page that demands one.")
def command(what, once, token):
    """Follow the link that writes LOG, or whose page is at URL (http://127.0.0.1:8321/), until Ctrl-C.

    On a terminal one screen is drawn anew with each report; elsewhere each report gives one line.
    """
    from .. import follow

    try:
        link = follow.follow(what, token)
    except OSError as error:
        raise ValueError(f"{what}: {error.strerror or error}") from None
    try:
        if once:
            return _once(link)
        return _screen(link) if sys.stdout.isatty() else _lines(link)
    except KeyboardInterrupt:
        return DONE
    finally:
        link.close()


def _once(link):
    from .. import watching

    latest = None
    for latest in link.poll():
        pass
    if latest is None:
        raise ValueError(f"{link.name}: no report yet")
    shown.show(watching.screen(latest.report, link.name, shown.console().width))
    return DONE


def _lines(link):
    from .. import live

    said = False
    while True:
        try:
            for record in link.poll():
                print(f"{record.report.get('time', ''):24}{live.plain_line(record.report)}", flush=True)
            said = False
        except ConnectionError as error:
            if not said:  # once, not twice a second
                print(error, file=sys.stderr, flush=True)
            said = True
        time.sleep(POLL_SECONDS)


def _screen(link):
    from rich.live import Live
    from rich.text import Text

    from .. import watching

    console = shown.console()
    report, remark = None, ""
    with Live(Text(f"{link.name}: waiting for a report", style=shown.QUIET), console=console, auto_refresh=False) as live:
        while True:
            try:
                news = None
                for news in link.poll():
                    report = news.report
                changed, remark = news is not None or bool(remark), ""
            except ConnectionError as error:
                changed, remark = not remark, str(error)
            if changed and report is not None:
                live.update(watching.screen(report, link.name, console.width, remark), refresh=True)
            elif changed:
                live.update(Text(f"{remark or link.name + ': waiting for a report'}", style=shown.WARN if remark else shown.QUIET), refresh=True)
            time.sleep(POLL_SECONDS)

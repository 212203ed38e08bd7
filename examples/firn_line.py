# SPDX-License-Identifier: GPL-3.0-or-later
"""Steps the Firn line through several Es/N0, shows it while it runs, and leaves tables, plots and the log of reports."""

import json
import math
import threading
from pathlib import Path

import click
from gnuradio import halfplane
from gnuradio.halfplane import documents, live
from gnuradio.halfplane.cli import arguments, run_command, shown

from flowgraphs.a_simulated_link import FirnLink

HERE = Path(__file__).resolve().parent
PATTERN = "draw:2026"
STEPS = 6
# The symbol error rates between which the steps lie unless --es-n0 says otherwise.
HIGHEST_SER, LOWEST_SER = 0.2, 3e-5
FEWEST_SYMBOLS, MOST_SYMBOLS = 400_000, 20_000_000


@click.command(context_settings={"help_option_names": ["-h", "--help"]})
@click.option("--set", "what", default=str(HERE / "sets" / "firn-12.json"), metavar="SET", help="Constellation: a name or a set file. [firn-12]")
@click.option("--es-n0", "es_n0", type=arguments.Range(), help="Es/N0 in dB: LO..HI/STEP or one number. [six steps that suit the set]")
@click.option("--errors", type=arguments.Count(), default=1000, show_default=True, help="Symbol errors to wait for at each step, as the exact rate has it.")
@click.option("--out", type=click.Path(file_okay=False, path_type=Path), default=Path("firn-out"), show_default=True, help="Folder for plots and log; files of an earlier run are replaced.")
def main(what, es_n0, errors, out):
    """Run the Firn line in GNU Radio and compare what it counts with what its constellation permits."""
    signal_set = halfplane.load_set(what)
    predictor = halfplane.predictor(signal_set)
    steps = es_n0 or suitable_steps(predictor)
    out.mkdir(parents=True, exist_ok=True)
    log = out / "reports.jsonl"
    log.unlink(missing_ok=True)

    reports = run(signal_set, predictor, steps, errors, log)
    if not reports:
        raise click.ClickException("interrupted before the first window was judged")
    written = [*draw(predictor, reports, out), log]
    shown.show(live.steps_table(reports), *(shown.quiet(f"written: {path}") for path in written))


def suitable_steps(predictor):
    """Six Es/N0, evenly spaced to half a decibel, over the rates that are worth measuring in a minute."""
    low, high = (float(predictor.es_n0_db_for_ser(rate)) for rate in (HIGHEST_SER, LOWEST_SER))
    low = math.floor(low)
    step = max(0.5, math.floor(2 * (high - low) / (STEPS - 1)) / 2)
    return [low + k * step for k in range(STEPS)]


def symbols_for(predictor, es_n0_db, errors):
    """Symbols in which the exact rate has as many errors, within what a minute allows."""
    wanted = errors / max(predictor.ser(es_n0_db), 1e-300)
    return int(min(max(wanted, FEWEST_SYMBOLS), MOST_SYMBOLS))


def run(signal_set, predictor, steps, errors, log):
    """The final report of each step. Ctrl-C ends the run after what has been judged so far."""
    reports = []
    heading = f"Firn line · {signal_set.name} · {signal_set.size} points · {PATTERN}"
    with live.LinkView(heading, len(steps)) as view:
        for number, es_n0_db in enumerate(steps):
            symbols = symbols_for(predictor, es_n0_db, errors)
            view.start(es_n0_db, symbols)
            link = FirnLink(signal_set, PATTERN, es_n0_db, symbols, log, seed=number + 1, window=max(10_000, symbols // 100))
            interrupted = follow(link, view)
            report = latest(link)
            if report:
                view.finish(report)
                reports.append(report)
            if interrupted:
                break
    return reports


def follow(link, view):
    """Runs the flowgraph to its end and shows its reports → whether it was interrupted."""
    # The host's wait() does not let Ctrl-C through; the waiting is left to a thread.
    link.start()
    ended = threading.Thread(target=link.wait, daemon=True)
    ended.start()
    try:
        while ended.is_alive():
            ended.join(1 / live.REFRESH_HZ)
            view.update(latest(link))
        return False
    except KeyboardInterrupt:
        link.stop()
        ended.join()
        return True


def latest(link):
    """The latest report of the watch, {} before the first."""
    return json.loads(link.watch.report() or "{}")


def draw(predictor, reports, out):
    """The two plots, each as SVG and PNG."""
    from gnuradio.halfplane.plots import link as plots

    at = [report["input"]["es_n0_db"] for report in reports]
    low, high = min(at) - 2, max(at) + 1.5
    document = documents.curve(predictor, [low + k * (high - low) / 120 for k in range(121)])
    for ending in ("svg", "png"):
        plots.draw_points(document, reports, out / f"points.{ending}")
        plots.draw_shortfall(reports, out / f"shortfall.{ending}")
        yield from (out / f"points.{ending}", out / f"shortfall.{ending}")


if __name__ == "__main__":
    run_command(main, "firn_line")

# SPDX-License-Identifier: GPL-3.0-or-later
"""`halfplane judge`: a recording through the objects of the live link, and what they say of it."""

import json
import os
import sys

import click
from rich.progress import BarColumn, Progress, TextColumn, TimeRemainingColumn, TransferSpeedColumn

from .. import core_python as core
from .. import documents, recordings
from . import DONE, FAILED, UNDECIDED, arguments, shown

INTERRUPTED = 130
_CODES = {"pass": DONE, "fail": FAILED, "undecided": UNDECIDED}


@click.command("judge")
@click.argument("path", metavar="RECORDING")
@click.option("--set", "what", metavar="SET", help="What was sent, where the recording does not say it.")
@click.option("--pattern", metavar="PATTERN", help="o150:N, draw:SEED[:PERIOD] or file:PATH, where the recording does not say it.")
@arguments.target_options
@click.option("--fer", type=arguments.Probability(), help="Target frame error rate; with --frame.")
@click.option("--frame", type=arguments.Count(), help="Symbols of a frame.")
@click.option("--max-excluded", type=arguments.Probability(), default=1e-3, show_default=True, help="Share of symbols left out beyond which nothing passes.")
@click.option("--confidence", type=arguments.Probability(), default=0.95, show_default=True, help="Of intervals and verdict.")
@click.option("--symbol-rate", type=arguments.Positive("HZ"), help="Where the recording does not say it.")
@click.option("--input-es-n0", type=float, metavar="DB", help="Es/N0 ahead of the receiver, for the shortfall at the input.")
@arguments.detector_option
@click.option("--format", "datatype", default="", metavar="FORMAT", help=f"Of a file without metadata: {', '.join(core.sample_formats())}.")
@click.option("--window", type=arguments.Count(), help="Symbols a report; by default fifty reports at most, of 10,000 at least.")
@click.option("--log", type=click.Path(dir_okay=False), metavar="FILE", help="Append every report, as link_log does.")
@click.option("--unverified", is_flag=True, help="Do not read the recording twice to verify the SHA-512 it states.")
@arguments.json_option
def command(path, what, pattern, ser, ber, fer, frame, max_excluded, confidence, symbol_rate, input_es_n0, detector, datatype, window, log, unverified, as_json):
    """Judge RECORDING: SigMF, or a file of samples with --format; one sample a symbol.

    Exit code 0 where it passes, 1 where it fails, 3 where that is not decided. Ctrl-C judges what was read.
    """
    target = _target(ser, ber, fer, frame)
    recording = core.recording(path, datatype, symbol_rate or 0.0)
    signal_set = core.load_set(what) if what else recordings.set_of(recording)
    if signal_set is None:
        raise click.UsageError("the recording does not say its set: give --set", click.get_current_context())
    pattern = pattern or recording.pattern
    if pattern is None:
        raise click.UsageError("the recording does not say its pattern: give --pattern", click.get_current_context())
    known = core.pattern(pattern, signal_set)

    columns = (TextColumn("{task.description}"), BarColumn(), TextColumn("{task.percentage:3.0f} %"), TransferSpeedColumn(), TimeRemainingColumn())
    console = shown.console(sys.stderr if sys.stderr.isatty() else open(os.devnull, "w"))
    with Progress(*columns, console=console, transient=True) as bar:
        digest = _digest(recording, bar, unverified)
        task = bar.add_task("judging", total=os.path.getsize(recording.data_path))
        size = os.path.getsize(recording.data_path) / recording.samples
        result = core.judge(
            recording, signal_set, known, target=target, frame_symbols=frame or 0, max_excluded=max_excluded,
            confidence=confidence, detector=detector or "automatic", window=window or 0, input_es_n0_db=input_es_n0,
            log=log or "", progress=lambda done: bar.update(task, completed=done * size),
        )  # fmt: skip
    report = json.loads(result["report"])
    report["recording"] = _about(recording, digest)
    for remark in _remarks(recording, report, result):
        print(f"halfplane judge: {remark}", file=sys.stderr)
    if as_json:
        click.echo(documents.dumps(report | {"settings": json.loads(result["settings"])}))
    else:
        from .. import watching

        shown.show(watching.screen(report, path, shown.console().width))
    return code_of(report, result["interrupted"])


def code_of(report, interrupted):
    """The exit code of what was judged; every path to one is here."""
    if interrupted:
        return INTERRUPTED
    return _CODES.get(report.get("verdict", {}).get("state"), UNDECIDED)


def _target(ser, ber, fer, frame):
    given = [f"{name}:{value!r}" for name, value in (("ser", ser), ("ber", ber), ("fer", fer)) if value is not None]
    if len(given) != 1:
        raise click.UsageError("give one of --ser, --ber and --fer", click.get_current_context())
    if fer is not None and frame is None:
        raise click.UsageError("--fer wants --frame, the symbols of a frame", click.get_current_context())
    return given[0]


def _digest(recording, bar, unverified):
    """How the SHA-512 that the recording states was found. ValueError where the samples are other ones."""
    stated = recording.sha512
    if stated is None:
        return "not stated"
    if unverified:
        return "unverified"
    task = bar.add_task("verifying", total=os.path.getsize(recording.data_path))
    found = recordings.sha512(recording.data_path, lambda done: bar.update(task, completed=done))
    bar.remove_task(task)
    if found != stated:
        raise ValueError(f"{recording.data_path}: its SHA-512 is {found[:16]}…, the metadata state {stated[:16]}…: other samples (--unverified judges them all the same)")
    return "verified"


def _about(recording, digest):
    about = {
        "format": recording.format, "samples": recording.samples, "read": recording.position,
        "captures": len(recording.captures), "gaps": sum(each["gap"] for each in recording.captures), "sha512": digest,
    }  # fmt: skip
    if recording.sample_rate is not None:
        about["sample_rate"] = recording.sample_rate
    if recording.ignored_bytes:
        about["ignored_bytes"] = recording.ignored_bytes
    return about


def _remarks(recording, report, result):
    """What must be said beside the report, one line each."""
    if not result["complete"]:
        yield f"interrupted after {recording.position} of {recording.samples} samples; what was read is judged"
    if recording.ignored_bytes:
        yield f"{recording.data_path} ends within a sample: its last {recording.ignored_bytes} bytes are left out"
    if report["total"]["judged"] == 0:
        yield f"no lock: the pattern {report.get('pattern', '')} was not found in {report['total']['in']} symbols, so nothing was judged"
    if "log_error" in result:
        yield f"{result['log_failed']} reports are not in the log: {result['log_error']}"

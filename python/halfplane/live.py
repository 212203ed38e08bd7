# SPDX-License-Identifier: GPL-3.0-or-later
"""A link on the terminal while it runs: what was counted, between the predicted figures, step by step."""

import math
import sys
import time
from dataclasses import dataclass, field

from rich.console import Group
from rich.live import Live
from rich.text import Text

from .cli import shown
from .views import words

REFRESH_HZ = 4
_LETTERS = {"nearest": "n", "union": "u", "facing": "f", "exact": "x"}


@dataclass
class Step:
    """One Es/N0 of a run: what is wanted, and the latest report."""

    es_n0_db: float
    symbols: int
    report: dict = field(default_factory=dict)
    started: float = field(default_factory=time.monotonic)

    @property
    def judged(self):
        return self.report.get("total", {}).get("judged", 0)

    @property
    def fraction(self):
        return min(1.0, self.report.get("total", {}).get("in", 0) / self.symbols)

    @property
    def seconds_to_go(self):
        """By the pace so far; None until there is one."""
        spent = time.monotonic() - self.started
        return spent * (1 - self.fraction) / self.fraction if self.fraction > 0.02 and spent > 0.5 else None


class LinkView:
    """
    Shows a run of several steps. Use as a context: start(), update() as reports come, finish() a step.

    On a terminal the screen is redrawn in place; elsewhere each step gives one plain line when it starts and one when
    it is done.
    """

    def __init__(self, heading, steps, stream=None):
        self.heading = heading
        self.steps = steps
        self.done = []
        self.step = None
        self.console = shown.console(stream or sys.stdout)
        self._live = None
        self._began = time.monotonic()

    def __enter__(self):
        if self.console.is_terminal:
            self._live = Live(self.screen(), console=self.console, refresh_per_second=REFRESH_HZ, transient=True)
            self._live.__enter__()
        else:
            self.console.print(self.heading)
        return self

    def __exit__(self, *error):
        if self._live:
            self._live.__exit__(*error)

    def start(self, es_n0_db, symbols):
        self.step = Step(es_n0_db, symbols)
        if not self._live:
            self._line(f"step {len(self.done) + 1} of {self.steps}: {shown.db(es_n0_db)} dB at the input, {symbols} symbols")
        self._draw()

    def update(self, report):
        """The latest report of the step that runs."""
        if report:
            self.step.report = report
        self._draw()

    def finish(self, report):
        self.step.report = report
        self.done.append(report)
        if not self._live:
            self._line(plain_line(report))
        self._draw()

    def _line(self, text):
        print(text, file=self.console.file, flush=True)

    def _draw(self):
        if self._live:
            self._live.update(self.screen())

    def screen(self):
        """Everything at this moment, as something that rich can print."""
        width = min(self.console.width, 110)
        parts = [self._head(width), Text()]
        if self.step:
            parts += [*_progress(self.step, width), Text(), *measured(self.step.report, width)]
        if self.done:
            parts += [Text(), steps_table(self.done, narrow=width < 104)]
        return Group(*parts)

    def _head(self, width):
        minutes, seconds = divmod(int(time.monotonic() - self._began), 60)
        right = f"step {min(len(self.done) + 1, self.steps)} of {self.steps}   {minutes}:{seconds:02d}"
        left = self.heading[: max(0, width - len(right) - 2)]
        return Text.assemble((left, shown.STRONG), " " * (width - len(left) - len(right)), (right, shown.QUIET))


def plain_line(report):
    """A finished step in one line of plain text."""
    total = report["total"]
    parts = [f"judged {total['judged']}", f"errors {total['symbol_errors']}"]
    for kind in ("ser", "ber"):
        if kind in total:
            exact = total.get("predicted", {}).get("exact", {}).get(kind)
            parts.append(f"{kind.upper()} {shown.rate(total[kind])} (exact {shown.rate(exact)})")
    for place in ("decision", "input"):
        if place in report.get("shortfall", {}):
            parts.append(f"shortfall at the {place} {_decibels(report['shortfall'][place])} dB")
    return "  " + ", ".join(parts)


def steps_table(reports, narrow=False):
    """One row a finished step; without the bit error rate where the terminal is narrow."""
    ber_columns = () if narrow else (("BER", shown.STRONG), "exact")
    result = shown.table(
        "input", "gauged", "judged", "errors", ("SER", shown.STRONG), "exact", *ber_columns, "at decision", "at input"
    )
    for report in reports:
        total = report["total"]
        exact = total.get("predicted", {}).get("exact", {})
        short = report.get("shortfall", {})
        ber_cells = () if narrow else (_rate(total.get("ber")), _rate(exact.get("ber")))
        result.add_row(
            shown.db(report.get("input", {}).get("es_n0_db")), shown.db(total.get("es_n0_db")),
            shown.count(total["judged"]), shown.count(total["symbol_errors"]),
            _rate(total.get("ser")), _rate(exact.get("ser")), *ber_cells,
            _decibels(short.get("decision")), _decibels(short.get("input")),
        )  # fmt: skip
    result.caption = "input, gauged: Es/N0 in dB; at decision, at input: shortfall in dB"
    result.caption_justify = "left"
    return result


def _rate(value):
    return shown.rate(value, digits=2)


def _decibels(fall):
    """A shortfall with half the width of its interval; an end alone where no errors give no more."""
    if not fall:
        return "–"
    if "db" not in fall:
        sign, end = ("≤", "db_high") if "db_high" in fall else ("≥", "db_low")
        return f"{sign} {shown.db(fall.get(end))}"
    if "db_low" not in fall or "db_high" not in fall:
        return shown.db(fall["db"])
    return f"{shown.db(fall['db'])} ± {(fall['db_high'] - fall['db_low']) / 2:.2f}"


def _progress(step, width):
    to_go = step.seconds_to_go
    right = f" {100 * step.fraction:3.0f} %" + (f"  {to_go:.0f} s to go" if to_go is not None else "")
    left = f"{shown.db(step.es_n0_db)} dB at the input  "
    room = max(10, width - len(left) - 18)
    full = round(room * step.fraction)
    yield Text.assemble((left, shown.STRONG), ("━" * full, "cyan"), ("━" * (room - full), "bright_black"), (right, shown.QUIET))


def measured(report, width):
    total = report.get("total")
    if not total:
        yield Text("waiting for the first window", style=shown.QUIET)
        return
    yield Text.assemble(
        ("judged ", shown.QUIET), shown.count(total["judged"]),
        ("   symbol errors ", shown.QUIET), shown.count(total["symbol_errors"]),
        ("   bit errors ", shown.QUIET), shown.count(total["bit_errors"]),
        ("   left out ", shown.QUIET), shown.count(sum(total.get("excluded", {}).values())),
        ("   pending ", shown.QUIET), shown.count(total.get("pending", 0)),
    )  # fmt: skip
    yield Text()
    rates = shown.table("", ("measured", shown.STRONG), "interval", ("exact", shown.STRONG), "facing", "union", "nearest")
    predicted = total.get("predicted", {})
    for kind in ("ser", "ber"):
        rates.add_row(
            kind.upper(), _rate(total.get(kind)),
            shown.span(total.get(kind + "_low"), total.get(kind + "_high"), digits=2),
            *(_rate(predicted.get(rung, {}).get(kind)) for rung in ("exact", "facing", "union", "nearest")),
        )  # fmt: skip
    yield rates
    yield Text()
    yield from strip(total, width)
    yield Text()
    short = report.get("shortfall", {})
    lock = report.get("lock", {})
    yield shown.facts(
        [
            (f"shortfall at the {place}", _decibels(short[place]) + " dB" if place in short else "–")
            for place in ("decision", "input")
        ]
        + [
            ("gauged Es/N0", _gauged(total)),
            ("lock", _lock(lock)),
        ]
        + [(f"{title.lower()}: {what}", said) for title, rows in words.unjudged(total) for what, said in rows]
    )


def _gauged(total):
    if "es_n0_db" not in total:
        return "–"
    parts = [f"{total['es_n0_db']:.2f} ± {total.get('es_n0_db_se', 0):.2f} dB"]
    if "gain_db" in total:
        parts.append(f"gain {total['gain_db'] + 0.0:.2f} dB")
    if "phase_deg" in total:
        parts.append(f"phase {total['phase_deg'] + 0.0:.2f}°")
    if "evm_rms" in total:
        parts.append(f"EVM {total['evm_rms']:.4f}")
    return ", ".join(parts)


def _lock(lock):
    if not lock:
        return "–"
    style = {"held": shown.GOOD, "searching": shown.WARN, "doubtful": shown.WARN, "lost": shown.BAD}.get(lock.get("state"))
    text = Text(lock.get("state", "–"), style=style or "")
    for name, unit in (("delay", " symbols"), ("rotation_deg", "°")):
        if name in lock:
            text.append(f", {name.replace('_deg', '')} {lock[name]:g}{unit}")
    for name in ("mirrored", "inverted"):
        if lock.get(name):
            text.append(f", {name}")
    return text


def strip(total, width):
    """
    Measured SER and BER with their intervals among the rungs, on one logarithmic scale: `●` is the count, `━` its
    interval, and the letters above stand where the rungs are.
    """
    predicted = total.get("predicted", {})
    values = [figures[kind] for figures in predicted.values() for kind in ("ser", "ber") if figures.get(kind, 0) > 0]
    values += [total[key] for key in ("ser", "ser_low", "ser_high", "ber", "ber_low", "ber_high") if total.get(key, 0) > 0]
    if not values:
        return
    low, high = math.log10(min(values)), math.log10(max(values))
    margin = max(0.05, 0.04 * (high - low))
    low, high = low - margin, high + margin
    room = width - 6

    def place(value):
        return min(room - 1, max(0, round((math.log10(value) - low) / (high - low) * (room - 1))))

    for kind in ("ser", "ber"):
        letters = [" "] * room
        for rung, letter in _LETTERS.items():
            if predicted.get(rung, {}).get(kind, 0) > 0:
                letters[place(predicted[rung][kind])] = letter
        line = [("·", "bright_black")] * room
        if total.get(kind + "_high", 0) > 0:
            start = place(total[kind + "_low"]) if total.get(kind + "_low", 0) > 0 else 0
            for k in range(start, place(total[kind + "_high"]) + 1):
                line[k] = ("━", "magenta")
        if total.get(kind, 0) > 0:
            line[place(total[kind])] = ("●", "bold magenta")
        yield Text("      " + "".join(letters), style="cyan")
        yield Text.assemble((kind.upper() + "   ", shown.STRONG), *line)
    marks = [" "] * (room + 12)
    for text, at in _scale(low, high):
        k = 6 + round((at - low) / (high - low) * (room - 1))
        if "".join(marks[max(0, k - 1) : k + len(text) + 1]).strip() == "" and k + len(text) <= len(marks):
            marks[k : k + len(text)] = text
    yield Text("".join(marks).rstrip(), style=shown.QUIET)
    yield Text("      x exact   f facing   u union   n nearest   ● counted   ━ interval", style=shown.QUIET)


def _scale(low, high):
    """Labels of a logarithmic scale: decades, and 2 and 5 between them where few decades show."""
    steps = (1,) if high - low > 3 else (1, 2, 5)
    for decade in range(math.floor(low), math.ceil(high) + 1):
        for step in steps:
            at = decade + math.log10(step)
            if low <= at <= high:
                yield f"{step}e{decade}", at

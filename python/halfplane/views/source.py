# SPDX-License-Identifier: GPL-3.0-or-later
"""
Where views get their reports from: a log file, a message's dict, a line of an event stream → (settings, report).

A log is JSON lines: a settings line {"schema": "halfplane/settings/1", "settings_sha256", "settings"} ahead of the
reports that were made under it, and again where the settings change; reports "halfplane/report/1", one a line. Logs
without settings lines are read too; views then say what they cannot know. A message is a report with the settings in it.
"""

from __future__ import annotations

import hashlib
import itertools
import json
from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path

from .trace import Trace

REPORT, SETTINGS = "halfplane/report/1", "halfplane/settings/1"
_DICTS = ("window", "total", "input", "shortfall", "lock", "seconds", "verdict")
_LISTS = ("losses", "premises")
_COUNTS = ("symbols", "symbol_errors", "bits", "bit_errors", "in", "judged", "pending", "nonfinite", "slips", "first_symbol", "live", "decoded")
_NUMBERS = ("p", "effect_db", "power_db", "cost_db")
# What must be one and the same in all that one acceptance report speaks of.
_COMMON = ("set", "pattern", "law", "detector", "decisions", "confidence")
_COMMON_SETTINGS = ("points", "labels", "priors")


class LogError(ValueError):
    """A log that cannot be used as it is; the message names file and line."""


class Torn(Exception):
    """A line that ends in its midst, as a crash or a full disk leaves it."""


@dataclass(frozen=True)
class Record:
    """A report with the settings that it was made under (None where its source does not say), and where it stood."""

    report: dict
    settings: dict | None
    line: int


class Reader:
    """Takes the lines of one source in order. name: of the source, for messages."""

    def __init__(self, name: str):
        self.name = name
        self.line = 0
        self._known: dict[str, dict] = {}

    def take(self, text: str) -> Record | None:
        """A line → its report, None for a settings line or an empty one. Raises LogError, or Torn for half a line."""
        self.line += 1
        text = text.strip()
        if not text:
            return None
        try:
            document = json.loads(text, parse_constant=self._no_number)
        except json.JSONDecodeError as error:
            if text.startswith("{") and _ends_early(text, error):
                raise Torn from None
            raise self._error(f"no JSON: {error.msg} at column {error.colno}") from None
        if not isinstance(document, dict):
            raise self._error("no report: expected a JSON object")
        return self.take_document(document)

    def take_document(self, document: dict) -> Record | None:
        """The same for a document that was parsed already, or a message's dict."""
        schema = document.get("schema")
        if schema == SETTINGS:
            settings = document.get("settings")
            if not isinstance(settings, dict) or not isinstance(document.get("settings_sha256"), str):
                raise self._error("a settings line without settings and settings_sha256")
            self._known[document["settings_sha256"]] = self._checked_settings(settings)
            return None
        if schema != REPORT:
            said = f'schema "{schema}"' if schema else "no schema"
            raise self._error(f'{said}, where "{REPORT}" or "{SETTINGS}" is read')
        self._check(document)
        report = {key: value for key, value in document.items() if key != "settings"}
        if isinstance(document.get("settings"), dict):
            settings = self._checked_settings(document["settings"])
        else:
            settings = self._known.get(report.get("settings_sha256", ""))
            if settings is None and self._known:
                raise self._error("the settings of this report stand nowhere above it")
        return Record(report, settings, self.line)

    def _error(self, what: str) -> LogError:
        return LogError(f"{self.name}:{self.line}: {what}")

    def _no_number(self, word: str):
        raise self._error(f"{word} is no number of JSON")

    def _check(self, report: dict) -> None:
        """The shape that the views rely on; values are left to speak for themselves."""
        for key in _DICTS:
            if key in report and not isinstance(report[key], dict):
                raise self._error(f'"{key}" is no object')
        for key in _LISTS:
            if key in report and not (isinstance(report[key], list) and all(isinstance(each, dict) for each in report[key])):
                raise self._error(f'"{key}" is no list of objects')
        for part in ("window", "total"):
            for key, value in report.get(part, {}).items():
                if key in _COUNTS and not (isinstance(value, int) and not isinstance(value, bool) and value >= 0):
                    raise self._error(f'"{part}.{key}" is no count: {value!r}')
                if key.split("_")[0] in ("ser", "ber", "es", "evm", "mer") and not _is_number(value):
                    raise self._error(f'"{part}.{key}" is no number: {value!r}')
        numbers = [("confidence", report.get("confidence", 0))]
        numbers += [(f"{key}.{name}", each[name]) for key in _LISTS for each in report.get(key, ()) for name in _NUMBERS if name in each]
        numbers += [(f"lock.{key}", value) for key, value in report.get("lock", {}).items() if key in ("delay", "rotation_deg", "frequency")]
        numbers += [(f"input.{key}", value) for key, value in report.get("input", {}).items() if key != "source"]
        numbers += [(f"total.excluded.{key}", value) for key, value in _dict(report.get("total", {}).get("excluded")).items()]
        for key, value in numbers:
            if not _is_number(value):
                raise self._error(f'"{key}" is no number: {value!r}')
        for part, key in itertools.product(("total", "window"), ("live_part", "decoded_part")):
            self._check_part(f"{part}.{key}", report.get(part, {}).get(key, {}))
        for part in ("total", "window"):
            for rung, figures in _dict(report.get(part, {}).get("predicted")).items():
                if not isinstance(figures, dict) or not all(map(_is_number, figures.values())):
                    raise self._error(f'"{part}.predicted.{rung}" is no object of numbers')
        for place, fall in report.get("shortfall", {}).items():
            if not isinstance(fall, dict) or not all(map(_is_number, fall.values())):
                raise self._error(f'"shortfall.{place}" is no object of numbers')

    def _check_part(self, name: str, part) -> None:
        """Symbols that were not known in advance: numbers, and as `predicted` rungs of numbers."""
        rungs = part.get("predicted", {}) if isinstance(part, dict) else None
        if not isinstance(rungs, dict) or not all(_is_number(value) for key, value in part.items() if key != "predicted"):
            raise self._error(f'"{name}" is no object of numbers')
        if not all(isinstance(figures, dict) and all(map(_is_number, figures.values())) for figures in rungs.values()):
            raise self._error(f'"{name}.predicted" holds no objects of numbers')

    def _checked_settings(self, settings: dict) -> dict:
        points, labels = settings.get("points", []), settings.get("labels", [])
        sound = isinstance(points, list) and all(isinstance(p, list) and len(p) == 2 and all(map(_is_number, p)) for p in points)
        if not sound or not isinstance(labels, list) or len(labels) != len(points):
            raise self._error("the settings' points and labels are not as many pairs of numbers and texts")
        return settings


def _dict(value) -> dict:
    return value if isinstance(value, dict) else {}


def _is_number(value) -> bool:
    return isinstance(value, (int, float)) and not isinstance(value, bool)


def _ends_early(text: str, error: json.JSONDecodeError) -> bool:
    """Whether the text is a beginning of JSON: the error lies at its end, or in a string or word that the end cuts off."""
    return error.pos >= len(text) - 1 or error.msg.startswith("Unterminated string") or error.pos + 8 > len(text)


def of_message(message: dict) -> tuple[dict | None, dict]:
    """A message of link_watch as a dict → (settings or None, report)."""
    record = Reader("message").take_document(message)
    if record is None:
        raise LogError("message: settings alone")
    return record.settings, record.report


@dataclass
class Run:
    """One run: from where its sequence starts to its latest report, across files where the log was put aside."""

    log: int  # number of the log that its latest report stands in; the lines are of this one
    first_line: int
    last_line: int
    first_time: str
    settings: dict | None
    report: dict  # the latest
    reports: int = 1


@dataclass
class Log:
    """A log that was read to its end; memory does not grow with its length."""

    name: str
    sha256: str
    size: int
    reports: int
    torn: list[int] = field(default_factory=list)  # numbers of lines that are not whole


@dataclass
class Logs:
    """Logs of one link: each run is a point."""

    logs: list[Log]
    runs: list[Run]
    trace: Trace


def lines(path: str | Path) -> Iterator[tuple[Record | None, bytes, bool]]:
    """
    (record or None, the raw line, whether it is torn) of each line of a log file. A file that holds one report over several
    lines, as `--json` prints it, counts as one line.
    """
    reader = Reader(str(path))
    with open(path, "rb") as stream:
        first = stream.readline()
        rest = [first + stream.read()] if first.strip() == b"{" else itertools.chain([first], stream) if first else []
        for raw in rest:
            try:
                yield reader.take(raw.decode("utf-8", errors="replace")), raw, False
            except Torn:
                yield None, raw, True


def read(paths) -> Logs:
    """Reads logs, in the order given. Raises LogError where one holds no report, or where they are not of one link."""
    found, before = Logs([], [], Trace()), None
    for number, path in enumerate(paths):
        digest, size, reports, torn, line = hashlib.sha256(), 0, 0, [], 0
        for record, raw, is_torn in lines(path):
            line += 1
            digest.update(raw)
            size += len(raw)
            if is_torn:
                torn.append(line)
            if record is None:
                continue
            if not _goes_on(before, record.report, reports == 0):
                run = Run(number, line, line, record.report.get("time", ""), record.settings, record.report)
                found.runs.append(run)
            else:
                run = found.runs[-1]
                if run.log != number:  # put aside and gone on in the next file
                    run.log, run.first_line = number, line
                run.last_line, run.report, run.settings = line, record.report, record.settings
                run.reports += 1
            _agree(found.runs[0], run, found.logs, path)
            found.trace.add(record.report)
            before = record.report
            reports += 1
        if reports == 0:
            raise LogError(f"{path}: no report in it")
        found.logs.append(Log(Path(path).name, digest.hexdigest(), size, reports, torn))
    return found


def _goes_on(before: dict | None, report: dict, first_of_file: bool) -> bool:
    """Whether a report is of the run before it: in one file as long as the sequence grows, in the next only where it goes on by one."""
    if before is None:
        return False
    last, now = before.get("sequence"), report.get("sequence")
    if first_of_file:
        return now is not None and last is not None and now == last + 1 and before.get("settings_sha256") == report.get("settings_sha256")
    return last is None or now is None or now > last


def _agree(first: Run, run: Run, logs: list[Log], path) -> None:
    """One report speaks of one link."""
    here = f"{path}:{run.last_line}"
    there = f"{logs[first.log].name if first.log < len(logs) else path}:{first.first_line}"
    for key in _COMMON:
        one, other = first.report.get(key), run.report.get(key)
        if one != other:
            raise LogError(f"{here}: {key} is {other}, but {one} at {there}; they are not one link, report on them apart")
    if first.settings is not None and run.settings is not None and first.settings is not run.settings:
        for key in _COMMON_SETTINGS:
            if first.settings.get(key) != run.settings.get(key):
                raise LogError(f"{here}: the set's {key} differ from those at {there}; report on them apart")

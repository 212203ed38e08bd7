# SPDX-License-Identifier: GPL-3.0-or-later
"""SigMF metadata for recordings: written beside a file of samples, and the digest of the samples verified."""

from __future__ import annotations

import datetime as calendar
import hashlib
import json
import math
import os
from collections.abc import Callable
from pathlib import Path

from . import core_python as core

# From memory of SigMF 1.x: the version that is named, and the rules for its fields.
SIGMF_VERSION = "1.0.0"
EXTENSION = {"name": "halfplane", "version": "1.0.0", "optional": True}
META, DATA = ".sigmf-meta", ".sigmf-data"
_PIECE = 1 << 20


def write_meta(
    path: str | os.PathLike,
    datatype: str = "cf32_le",
    sample_rate: float | None = None,
    *,
    datetime: str | calendar.datetime | None = None,
    frequency: float | None = None,
    description: str | None = None,
    author: str | None = None,
    set: core.signal_set | str | None = None,
    pattern: str | None = None,
    digest: bool = False,
    replace: bool = False,
) -> Path:
    """
    Writes SigMF metadata beside the samples in `path`, such as a file sink has written → the metadata's path.

    NAME.sigmf-data gets NAME.sigmf-meta. Any other file keeps its name, which core:dataset then says: firn.cf32 gets
    firn.sigmf-meta. sample_rate in Hz: the symbol rate where there is one sample a symbol. datetime: of the first sample;
    with a time zone. frequency: Hz. digest: core:sha512 of the file. replace: overwrite metadata that are there.

    set and pattern say what was sent, so that `judge` need not be told: halfplane:set (the name of a set, or the points
    of its own) and halfplane:pattern, a SigMF extension that other programs may pass over. A pattern `file:…` is refused,
    as it means nothing on another machine.
    """
    path = Path(path)
    if path.name.endswith(META) or path.name.endswith((".sigmf", ".sigmf-collection")):
        raise ValueError(f"{path}: name the file of samples")
    samples = _samples(path, datatype)
    meta = path.with_name(path.name[: -len(DATA)] + META) if path.name.endswith(DATA) else path.with_suffix(META)
    document = {"core:datatype": datatype, "core:version": SIGMF_VERSION, "core:num_channels": 1, "core:recorder": f"gr-halfplane {core.__version__}"}
    if sample_rate is not None:
        document["core:sample_rate"] = _number("sample rate", sample_rate, above_zero=True)
    if not path.name.endswith(DATA):
        document["core:dataset"] = path.name
    for field, text in (("core:description", description), ("core:author", author)):
        if text:
            document[field] = text
    document |= _sent(set, pattern)
    if digest:
        document["core:sha512"] = sha512(path)
    capture = {"core:sample_start": 0}
    if frequency is not None:
        capture["core:frequency"] = _number("frequency", frequency)
    if datetime is not None:
        capture["core:datetime"] = _utc(datetime)
    if samples == 0:
        raise ValueError(f"{path}: no sample in it")
    text = json.dumps({"global": document, "captures": [capture], "annotations": []}, indent=4, ensure_ascii=False, allow_nan=False)
    _write(meta, text + "\n", replace)
    return meta


def _samples(path: Path, datatype: str) -> int:
    """Whole samples in a file, read as the judge will read it: so a format that is not known is refused here already."""
    return core.recording(str(path), datatype).samples


def _number(name: str, value: float, above_zero: bool = False) -> float:
    value = float(value)
    if not math.isfinite(value) or (above_zero and value <= 0):
        raise ValueError(f"{name} must be a finite number of Hz{' above 0' if above_zero else ''}, got {value}")
    return value


def _utc(moment: str | calendar.datetime) -> str:
    """RFC 3339 in UTC. A moment without a time zone is refused: whose clock it was cannot be known."""
    if isinstance(moment, str):
        try:
            read = calendar.datetime.fromisoformat(moment)
        except ValueError:
            raise ValueError(f"'{moment}' is no moment such as 2026-12-01T06:30:00.000Z") from None
    else:
        read = moment
    if read.tzinfo is None:
        raise ValueError(f"{moment} lacks its time zone: end it in Z for UTC")
    return read.astimezone(calendar.timezone.utc).isoformat(timespec="microseconds").replace("+00:00", "Z")


def _sent(set: core.signal_set | str | None, pattern: str | None) -> dict:
    if set is None and pattern is None:
        return {}
    found = {"core:extensions": [EXTENSION]}
    if set is not None:
        loaded = core.load_set(set) if isinstance(set, str) else set
        named = isinstance(set, str) and not os.path.exists(set)
        found["halfplane:set"] = set if named else json.loads(core.set_json(loaded))
        if pattern is not None:
            core.pattern(pattern, loaded)  # refuses what the set cannot carry
    if pattern is not None:
        if pattern.startswith("file:"):
            raise ValueError(f"pattern {pattern}: a path means nothing elsewhere; name it when judging")
        found["halfplane:pattern"] = pattern
    return found


def _write(path: Path, text: str, replace: bool) -> None:
    """Whole or not at all."""
    if path.exists() and not replace:
        raise ValueError(f"{path} is there already")
    unfinished = path.with_name(path.name + ".part")
    unfinished.write_text(text, encoding="utf-8")
    os.replace(unfinished, path)


def sha512(path: str | os.PathLike, progress: Callable[[int], None] | None = None) -> str:
    """SHA-512 of a file, in hexadecimal. progress is told how many bytes were read."""
    digest, done = hashlib.sha512(), 0
    with open(path, "rb", buffering=0) as file:
        while piece := file.read(_PIECE):
            digest.update(piece)
            done += len(piece)
            if progress is not None:
                progress(done)
    return digest.hexdigest()


def set_of(recording: core.recording) -> core.signal_set | None:
    """The set that a recording says was sent; None where it does not."""
    text = recording.set_text
    if text is None:
        return None
    if text.lstrip().startswith("{"):
        return core.parse_set_json(text, f"halfplane:set of {recording.data_path}")
    return core.named_set(text)

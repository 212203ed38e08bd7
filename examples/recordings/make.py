# SPDX-License-Identifier: GPL-3.0-or-later
"""Makes firn-14db.sigmf-data and its metadata: 40,000 symbols of the Firn line, one ci8 sample each, as a receiver left them."""

import math
from pathlib import Path

import numpy as np
from gnuradio import halfplane
from gnuradio.halfplane import recordings

HERE = Path(__file__).resolve().parent
SYMBOLS, ES_N0_DB, FIRST = 40_000, 14.0, 1234
PATTERN = "draw:2026"
GAIN = 0.25 * np.exp(0.6j)  # so that ci8 neither clips nor is coarse


def samples(signal_set):
    """The pattern from symbol FIRST on, in noise, with the receiver's gain and phase."""
    random = np.random.default_rng(2026)
    sent = halfplane.pattern(PATTERN, signal_set).indices(FIRST, SYMBOLS).astype(int)
    deviation = math.sqrt(signal_set.es * 10 ** (-ES_N0_DB / 10) / 2)
    noise = deviation * (random.standard_normal(SYMBOLS) + 1j * random.standard_normal(SYMBOLS))
    return GAIN * (signal_set.points[sent] + noise)


def main():
    signal_set = halfplane.load_set(str(HERE.parent / "sets" / "firn-12.json"))
    pairs = np.stack([(received := samples(signal_set)).real, received.imag], axis=-1)
    data = HERE / "firn-14db.sigmf-data"
    data.write_bytes(np.clip(np.round(pairs * 128), -128, 127).astype(np.int8).tobytes())
    recordings.write_meta(
        data, "ci8", 10_000, datetime="2026-12-01T06:30:00Z", frequency=869.525e6,
        description="Firn line, simulated: 14 dB ahead of the decision", set=signal_set, pattern=PATTERN, digest=True, replace=True,
    )  # fmt: skip


if __name__ == "__main__":
    main()

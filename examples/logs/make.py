# SPDX-License-Identifier: GPL-3.0-or-later
"""
Makes firn-14db.jsonl, the log that the README's report and screen are of: the Firn line at 14 dB, with a target and frames.

    PYTHONPATH=build/python python3 examples/logs/make.py
"""

import sys
from pathlib import Path

from gnuradio import halfplane

EXAMPLES = Path(__file__).resolve().parent.parent
sys.path.insert(0, str(EXAMPLES))

from flowgraphs.a_simulated_link import FirnLink  # noqa: E402


def main():
    log = Path(__file__).resolve().parent / "firn-14db.jsonl"
    log.unlink(missing_ok=True)
    signal_set = halfplane.load_set(str(EXAMPLES / "sets" / "firn-12.json"))
    options = {"target": "ser:2e-2", "frame_symbols": 20, "symbol_rate": 50e3}
    FirnLink(signal_set, "draw:2026", 14, 400_000, log=log, window=80_000, **options).run()


if __name__ == "__main__":
    main()

# SPDX-License-Identifier: GPL-3.0-or-later
"""What the settings of a link say that its reports are compared with: the set, its predictor, its cells."""

from __future__ import annotations

import functools
import math

import numpy as np

from .. import core_python as core

# Beyond so many points a report counts no transitions, and a map shows neither arrows nor labels.
MOST_POINTS_IN_DETAIL = 256


class Basis:
    """Set and predictor of settings, with what was computed from them; made by `of`."""

    def __init__(self, name: str, points, labels, priors, law: str, detector: str):
        self.set = core.signal_set(list(points), list(labels), priors=list(priors) if priors else None, name=name)
        self.predictor = core.predictor(self.set, law, detector)
        self._outlines: tuple | None = None
        self._shares: tuple | None = None
        self._curve: tuple | None = None

    @property
    def map_cells(self) -> bool:
        """Whether the cells move with N0."""
        return self.predictor.detector == "map" and not self.set.uniform

    def n0(self, es_n0_db: float) -> float:
        return self.set.es / 10 ** (es_n0_db / 10)

    def outlines(self, frame: tuple[float, float, float, float], es_n0_db: float | None):
        """Cells within (left, right, bottom, top); MAP ones at this Es/N0 where they depend on it and it is known."""
        n0 = self.n0(es_n0_db) if self.map_cells and es_n0_db is not None else 0.0
        if self._outlines is None or self._outlines[0] != (frame, n0):
            self._outlines = (frame, n0), core.outlines(self.set, *frame, n0)
        return self._outlines[1]

    def curve(self, low: float, high: float) -> dict:
        """predictor.rates over a range of Es/N0 in dB, with es_n0_db; fewer values where each takes long."""
        if self._curve is None or self._curve[0] != (low, high):
            number = 97 if self.set.size <= 256 else 33 if self.set.size <= 1024 else 13
            at = np.linspace(low, high, number)
            self._curve = (low, high), {"es_n0_db": at.tolist(), **self.predictor.rates(at)}
        return self._curve[1]

    def _rates_and_transitions(self, es_n0_db: float):
        """Exact error rate of each point, and P(j|i); to a tenth of a decibel, since only their ratios are used."""
        at = round(es_n0_db, 1)
        if self._shares is None or self._shares[0] != at:
            detailed = self.set.size <= MOST_POINTS_IN_DETAIL
            rates = self.predictor.rates(at)["exact"]
            self._shares = at, rates["ser_by_point"], rates["ser"], self.predictor.transitions(at) if detailed else None
        return self._shares[1:]

    def errors_by_point(self, total: dict) -> tuple[list[int], list[float]] | None:
        """
        Errors counted and expected of each point sent, from a report's transitions; None where nothing is to compare.

        How often a point was sent is n_i = Σ_j expected_ij / Σ_j P(j|i) over the transitions that were counted, so the
        expectation of all its errors is n_i · P(error|i). A point without a counted error: its prior's share of the
        expectation of all.
        """
        es_n0_db, overall = total.get("es_n0_db"), total.get("predicted", {}).get("exact", {}).get("ser")
        if es_n0_db is None or overall is None or self.set.size > MOST_POINTS_IN_DETAIL:
            return None
        by_point, mean, transitions = self._rates_and_transitions(es_n0_db)
        size = self.set.size
        counted, listed, probable = [0] * size, [0.0] * size, [0.0] * size
        for source, to, number, *expected in total.get("transitions", ()):
            counted[source] += number
            if expected:
                listed[source] += expected[0]
                probable[source] += transitions[source, to]
        scale = total["symbols"] * overall / mean if mean > 0 else 0.0
        priors = self.set.priors
        expected_of = [
            float(by_point[i] * listed[i] / probable[i]) if probable[i] > 0 else float(scale * priors[i] * by_point[i]) for i in range(size)
        ]
        return counted, expected_of


def of(settings: dict | None) -> Basis | None:
    """The basis of a settings document; None where the settings or their points are not known. Kept for the latest few."""
    if not settings or "points" not in settings:
        return None
    priors = settings.get("priors")
    return _made(
        settings.get("set", ""),
        tuple(complex(i, q) for i, q in settings["points"]),
        tuple(settings["labels"]),
        tuple(priors) if priors else None,
        settings.get("law", "awgn"),
        settings.get("detector", "automatic"),
    )


_made = functools.lru_cache(maxsize=8)(Basis)


def deviation(counted: float, expected: float, dispersion: float = 1.0) -> float:
    """
    Standard deviations by which a count departs from its expectation, errors in clumps of `dispersion`: the square-root
    transform of a Poisson count (Anscombe, Biometrika 35 (1948) 246), whose mean is √(x + 1/8) up to order x^(−3/2).
    """
    return 2 * (math.sqrt(counted + 0.375) - math.sqrt(expected + 0.125)) / math.sqrt(max(1.0, dispersion))

# SPDX-License-Identifier: GPL-3.0-or-later
"""RANGE, counts and probabilities as users write them."""

import click
import pytest
from gnuradio.halfplane.cli.arguments import Count, Positive, Probability, parse_range


@pytest.mark.parametrize(
    ("text", "values"),
    [
        ("7", [7.0]),
        ("-3.5", [-3.5]),
        ("0..4/2", [0.0, 2.0, 4.0]),
        ("-2..2/1", [-2.0, -1.0, 0.0, 1.0, 2.0]),
        ("5..5/1", [5.0]),
        # Exact decimals: binary sums would hold 0.30000000000000004.
        ("0..0.5/0.1", [0.0, 0.1, 0.2, 0.3, 0.4, 0.5]),
        # Both ends are in even where the step does not lead to the upper one.
        ("0..10/4", [0.0, 4.0, 8.0, 10.0]),
        ("1..2/5", [1.0, 2.0]),
        ("1e1..2e1/5", [10.0, 15.0, 20.0]),
    ],
)
def test_range(text, values):
    assert parse_range(text) == values


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("", "not a number"),
        ("x", "'x'"),
        ("0..10", "lacks its step"),
        ("10..0/1", "below the lower end"),
        ("0..10/0", "not above 0"),
        ("0..10/-1", "not above 0"),
        ("0..10/1/2", "not a number"),
        ("nan", "not finite"),
        ("0..inf/1", "not finite"),
        ("1e9", "beyond 1000 dB"),
        ("0..1000/1e-9", "more than"),
    ],
)
def test_range_refused(text, says):
    with pytest.raises(ValueError, match=says):
        parse_range(text)


def convert(kind, text):
    return kind.convert(text, None, None)


def test_counts():
    assert convert(Count(), "1e9") == 10**9
    assert convert(Count(), "9007199254740993") == 9007199254740993  # odd beyond 2^53: no double in between
    for text in ("0", "-1", "1.5", "nan", "1e19", "ten"):
        with pytest.raises(click.BadParameter):
            convert(Count(), text)


def test_probabilities():
    assert convert(Probability(), "1e-300") == 1e-300
    for text in ("0", "1", "-0.1", "nan", "inf", "half"):
        with pytest.raises(click.BadParameter):
            convert(Probability(), text)


def test_positive():
    assert convert(Positive(), "2.5e6") == 2.5e6
    for text in ("0", "-1", "nan", "inf", "x"):
        with pytest.raises(click.BadParameter):
            convert(Positive(), text)

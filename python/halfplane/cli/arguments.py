# SPDX-License-Identifier: GPL-3.0-or-later
"""The arguments that several commands share: SET, RANGE, LAW, detector, target."""

import math
import re
from decimal import Decimal, InvalidOperation

import click

MAX_ROWS = 100_000

_RANGE = re.compile(r"^(?P<low>.+?)\.\.(?P<high>.+?)(?:/(?P<step>.+))?$")


def parse_range(text):
    """LO..HI/STEP (both ends in) or one number → list of floats. ValueError says what is wrong."""
    match = _RANGE.match(text)
    if match is None:
        return [float(_number(text, text))]
    if match["step"] is None:
        raise ValueError(f"'{text}' lacks its step: LO..HI/STEP, as 0..10/0.5")
    low, high, step = (_number(match[part], text) for part in ("low", "high", "step"))
    if step <= 0:
        raise ValueError(f"'{text}': the step {step} is not above 0")
    if high < low:
        raise ValueError(f"'{text}': the upper end {high} is below the lower end {low}")
    if (high - low) / step > MAX_ROWS:
        raise ValueError(f"'{text}' asks for more than {MAX_ROWS} values")
    # Decimal, so that 0..1/0.1 holds 0.3 and not 0.30000000000000004; and the upper end is in even where no
    # whole number of steps leads to it.
    values = [low + k * step for k in range(int((high - low) / step) + 1)]
    if values[-1] != high:
        values.append(high)
    return [float(value) for value in values]


def _number(part, whole):
    try:
        number = Decimal(part)
    except InvalidOperation:
        raise ValueError(f"'{part}' in '{whole}' is not a number: LO..HI/STEP or one number, in dB") from None
    if not number.is_finite():
        raise ValueError(f"'{part}' in '{whole}' is not finite")
    if abs(number) > 1000:
        raise ValueError(f"'{part}' in '{whole}' is beyond 1000 dB")
    return number


class Range(click.ParamType):
    name = "RANGE"

    def convert(self, value, param, ctx):
        if isinstance(value, list):
            return value
        try:
            return parse_range(value)
        except ValueError as refused:
            self.fail(str(refused), param, ctx)


class Probability(click.ParamType):
    """A number above 0 and below 1."""

    name = "P"

    def convert(self, value, param, ctx):
        try:
            number = float(value)
        except ValueError:
            self.fail(f"'{value}' is not a number", param, ctx)
        if not 0 < number < 1:
            self.fail(f"{value} is not between 0 and 1", param, ctx)
        return number


class Count(click.ParamType):
    """A whole number above 0; 1e9 is one too."""

    name = "N"

    def convert(self, value, param, ctx):
        try:
            number = Decimal(str(value))
        except InvalidOperation:
            self.fail(f"'{value}' is not a number", param, ctx)
        if not number.is_finite() or number != int(number) or not 1 <= number < 2**63:
            self.fail(f"{value} is not a whole number from 1 to 2^63 - 1", param, ctx)
        return int(number)


class Positive(click.ParamType):
    """A finite number above 0."""

    name = "X"

    def __init__(self, name="X"):
        self.name = name

    def convert(self, value, param, ctx):
        try:
            number = float(value)
        except ValueError:
            self.fail(f"'{value}' is not a number", param, ctx)
        if not (math.isfinite(number) and number > 0):
            self.fail(f"{value} is not a finite number above 0", param, ctx)
        return number


def _together(*decorators):
    def apply(function):
        for decorator in reversed(decorators):
            function = decorator(function)
        return function

    return apply


set_argument = click.argument("what", metavar="SET")

json_option = click.option("--json", "as_json", is_flag=True, help="Print one JSON document and nothing else.")

range_options = _together(
    click.option("--es-n0", "es_n0", type=Range(), help="Es/N0 in dB: LO..HI/STEP or one number."),
    click.option("--eb-n0", "eb_n0", type=Range(), help="Eb/N0 in dB instead; Eb = Es / entropy of the priors."),
)

law_option = click.option(
    "--law",
    default="awgn",
    show_default=True,
    metavar="LAW",
    help="awgn, rayleigh, rician:K_DB, nakagami:M, impulsive:A:GAMMA; LAW*L for L branches.",
)

detector_option = click.option(
    "--detector",
    type=click.Choice(["map", "ml"]),
    help="Decide for the most probable point (map) or the nearest (ml); they differ with unequal priors only,"
    " where map is the default.",
)

target_options = _together(
    click.option("--ser", type=Probability(), help="Target symbol error rate."),
    click.option("--ber", type=Probability(), help="Target bit error rate."),
)


def one_of(first, first_name, second, second_name):
    """Which of two options was given; exactly one must be."""
    if (first is None) == (second is None):
        raise click.UsageError(f"give either {first_name} or {second_name}", click.get_current_context())
    return first_name if first is not None else second_name


def es_n0_values(signal_set, es_n0, eb_n0):
    """The Es/N0 in dB that either option asks for."""
    one_of(es_n0, "--es-n0", eb_n0, "--eb-n0")
    if es_n0 is not None:
        return es_n0
    return [value + 10 * math.log10(signal_set.entropy_bits) for value in eb_n0]

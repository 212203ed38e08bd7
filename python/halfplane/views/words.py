# SPDX-License-Identifier: GPL-3.0-or-later
"""Numbers and states of a report in words, the same in every view."""

from __future__ import annotations

import math

UNKNOWN = "not known yet"
RUNGS = ("exact", "facing", "union", "nearest")
# What stands before a rung's name: how its figure stands to the rate that it predicts.
_RELATION = {
    "ser": {"exact": "", "facing": "≤ ", "union": "≤ ", "nearest": "≈ "},
    "ber": {"exact": "", "facing": "≈ ", "union": "≤ ", "nearest": "≈ "},
}
KINDS = {"ser": "symbol error rate", "ber": "bit error rate", "fer": "frame error rate"}
CAUSES = {"before_lock": "before lock", "slip": "slip", "signal_lost": "signal lost", "overflow": "samples lost"}

_RAISED = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")


def power_of_ten(exponent: int) -> str:
    return "1" if exponent == 0 else "10" + str(exponent).translate(_RAISED)


def rate(value: float | None, digits: int = 3) -> str:
    """A probability with so many significant digits: 1.23·10⁻⁴; plain from 0.01 on."""
    if value is None:
        return UNKNOWN
    if value == 0:
        return "0"
    if value >= 0.01:
        return f"{value:.{digits - 1 - math.floor(math.log10(value) + 1e-12)}f}" if value < 1 else f"{value:.{digits - 1}f}"
    mantissa, exponent = f"{value:.{digits - 1}e}".split("e")
    return f"{mantissa}·{power_of_ten(int(exponent))}"


def interval(low: float | None, high: float | None, digits: int = 3) -> str:
    """An interval of rates; open below where no error was counted."""
    if high is None:
        return UNKNOWN
    if not low:
        return f"below {rate(high, digits)}"
    return f"{rate(low, digits)} to {rate(high, digits)}"


def db(value: float | None, digits: int = 2) -> str:
    """Decibels with a true minus sign; no sign before a zero."""
    if value is None:
        return UNKNOWN
    return f"{round(value, digits) + 0.0:.{digits}f}".replace("-", "−")


def count(value: int | float) -> str:
    """A whole number in groups of three."""
    return f"{round(value):,}".replace(",", "\u202f")


def rung(name: str, kind: str) -> str:
    """A rung's name with its relation to the rate: '≤ union'."""
    return _RELATION[kind][name] + name


def against(measured: float, low: float | None, high: float | None, exact: float) -> tuple[str, str]:
    """
    How a measured rate stands to the exact one → (role, words). Decided by whether the interval holds the exact rate,
    never by the estimate alone.
    """
    if high is not None and exact > high:
        return "fewer", f"{factor(measured / exact)} × exact" if measured > 0 else "fewer than predicted"
    if low is not None and exact < low:
        return "more", f"{factor(measured / exact)} × exact"
    return "even", "as predicted within the interval"


def factor(value: float) -> str:
    """A ratio with three significant digits up to a hundred."""
    if value == 0:
        return "0"
    digits = max(0, 2 - math.floor(math.log10(value)))
    return f"{value:.{min(digits, 4)}f}"


VERDICTS = ("pass", "fail", "undecided")
PREMISE_STATES = {"holds": ("good", "holds"), "fails": ("bad", "fails"), "too_few": ("quiet", "too few symbols to tell")}
_NAMES = {
    # causes of losses
    "iq_imbalance": "I/Q imbalance", "gain_error": "gain", "phase_error": "phase", "filter": "filter mismatch", "excess_noise": "receiver noise",
    "interaction": "acting together", "unexplained": "not explained", "rest": "not explained",
    # settings
    "max_excluded": "share that may be left out", "frame_symbols": "symbols of a frame",
    # premises
    "no_memory": "no memory of neighbours", "no_image": "no mirror image", "linear": "linear", "circular": "noise alike in all directions",
    "gaussian": "Gaussian noise", "steady_noise": "steady noise", "steady_gain": "steady gain", "white": "white noise",
}  # fmt: skip


def name(key: str) -> str:
    """A cause's or a premise's name in words."""
    return _NAMES.get(key, key.replace("_", " "))


def percent(share: float) -> str:
    """A share with two significant digits."""
    value = 100 * share
    if value == 0:
        return "0 %"
    if value < 0.001:
        return "below 0.001 %"
    if 99 <= value < 100:  # not all: never rounded to it
        return f"{min(value, 99.99):.2f} %"
    return f"{value:.{max(0, 1 - math.floor(math.log10(value)))}f} %"


def ends(fall: dict) -> str:
    """The interval of a shortfall: '0.45 to 0.49'."""
    if "db_low" in fall and "db_high" in fall:
        return f"{db(fall['db_low'])} to {db(fall['db_high'])} dB"
    if "db_low" in fall:
        return f"above {db(fall['db_low'])} dB"
    if "db_high" in fall:
        return f"below {db(fall['db_high'])} dB"
    return ""


def shortfall(fall: dict) -> str:
    """A shortfall with its interval: '0.47 dB (0.45 to 0.49 dB)'; an end alone where there is no estimate."""
    if not fall:
        return UNKNOWN
    if "db" not in fall:
        return ends(fall)
    return f"{db(fall['db'])} dB" + (f" ({ends(fall)})" if ends(fall) else "")


def lock(state: dict, slips: int = 0) -> str:
    """What lock was found, in words."""
    parts = []
    if "delay" in state:
        parts.append(f"delay {count(state['delay'])} symbols")
    if state.get("rotation_deg"):
        parts.append(f"turned {state['rotation_deg']:g}°")
    parts += [word for word in ("mirrored", "inverted") if state.get(word)]
    if slips:
        parts.append(f"{count(slips)} slip" + ("s" if slips != 1 else ""))
    return ", ".join(parts)


def counted(total: dict) -> str:
    """'2 341 errors in 19 998 240 symbols'."""
    errors = total.get("symbol_errors", 0)
    return f"{count(errors)} error{'s' if errors != 1 else ''} in {count(total.get('symbols', 0))} symbols"


def left_out(report: dict) -> float:
    """
    Share of the symbols that were left out since the first lock, not finite ones too: the verdict's own figure where there is
    one. What came before lock says nothing against the link.
    """
    verdict, total = report.get("verdict", {}), report.get("total", {})
    if "excluded_share" in verdict:
        return verdict["excluded_share"]
    out = total.get("nonfinite", 0) + sum(number for cause, number in total.get("excluded", {}).items() if cause != "before_lock")
    return out / (out + total.get("judged", 0)) if out else 0.0


def gauged(part: dict) -> str:
    """'14.48 ± 0.03 dB': an Es/N0 with its standard error."""
    if "es_n0_db" not in part:
        return UNKNOWN
    return f"{db(part['es_n0_db'])}" + (f" ± {part['es_n0_db_se']:.2g}" if "es_n0_db_se" in part else "") + " dB"


def unjudged(total: dict) -> list[tuple[str, list[tuple[str, str]]]]:
    """
    What is said of symbols that were not known in advance → (title, rows of (what, value)) for those known by decoding alone and
    for live traffic; none where there are none.
    """
    out = []
    if part := total.get("decoded_part"):
        wrong, of = part.get("symbol_errors", 0), part.get("symbols", 0)
        rows = [("symbol errors", f"{count(wrong)} of {count(of)}"), ("Es/N0", gauged(part)), ("frames that failed", "are missing here: it flatters")]
        out.append(("Known by decoding alone", rows))
    if part := total.get("live_part"):
        rows = [("Es/N0, gauged blindly", gauged(part)), ("from samples", count(part.get("sampled", 0)))]
        exact = part.get("predicted", {}).get("exact", {})
        rows += [(f"{kind.upper()} predicted", rate(exact[kind])) for kind in ("ser", "ber") if kind in exact]
        out.append(("Live traffic", [*rows, ("errors", "cannot be counted")]))
    return out


def certainty(total: dict, confidence: float) -> tuple[str, str]:
    """How well the symbol error rate is known → (words, role): good from an interval of a tenth on either side on."""
    ser, low, high = (total.get("ser" + end) for end in ("", "_low", "_high"))
    if ser is None or high is None:
        return "No symbol judged yet", "quiet"
    if not low:
        return f"SER below {rate(high)}, {100 * confidence:g} % sure", "open"
    half = (high - low) / 2 / ser
    return f"SER to ±{percent(half)}", "good" if half <= 0.1 else "open"


def target(of: dict) -> str:
    """'BER below 10⁻⁵'."""
    return ", ".join(f"{kind.upper()} below {_short(value)}" for kind, value in of.items() if isinstance(value, (int, float))) or UNKNOWN


def _short(value: float) -> str:
    """A round rate without the digits that say nothing: 10⁻⁵, 2.5·10⁻³."""
    if value >= 0.01:
        return f"{value:.3g}"
    mantissa, _, exponent = f"{value:.2e}".partition("e")
    mantissa = mantissa.rstrip("0").rstrip(".")
    return power_of_ten(int(exponent)) if mantissa == "1" else f"{mantissa}·{power_of_ten(int(exponent))}"


def about(number: float) -> str:
    """A large number in words, two digits: '1.2 million'."""
    for size, word in ((1e12, "million million"), (1e9, "thousand million"), (1e6, "million")):
        if number >= size:
            return f"{number / size:.{0 if number >= 10 * size else 1}f} {word}"
    return count(float(f"{number:.2g}"))


def verdict(found: dict) -> str:
    """A verdict in a sentence's head."""
    state = found.get("state")
    if state not in VERDICTS:
        return UNKNOWN.capitalize()
    said = {"pass": "Passes", "fail": "Fails", "undecided": "Undecided"}[state]
    wanted = target(found.get("target", {}))
    return f"{said}: {wanted}" if wanted != UNKNOWN else said


def premise(found: dict) -> str:
    """'fails by 0.12 dB', 'holds', 'too few symbols to tell'."""
    state = found.get("state")
    if state == "fails":
        return f"fails by {db(found['effect_db'])} dB" if "effect_db" in found else "fails"
    said = PREMISE_STATES.get(state, ("quiet", UNKNOWN))[1]
    if state == "holds" and "effect_db" in found:
        said += f" (effect {db(found['effect_db'])} dB)"
    return said

"""Numbers as text: rounded to their error, odds as ratios, huge Bayes factors by their power of ten.

Texts use the true minus sign, ± and ×; `workbench.records.screens.layout.plain_ascii` has the fallback.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

_LN_10 = math.log(10.0)
_PLAIN_BELOW = math.log(1e6)  # longer numbers are read wrongly, so they are shown by their power of ten
_PLAIN_ABOVE = math.log(1e-4)
_MEANINGLESS = 1e16
_LEAST_PLAIN = 1e-8
_MOST_DIGITS = 6  # nobody defends odds beyond them
_MOST_DECIMALS_OF_LN = 4


def decimals_for(error: float) -> int:
    """Return the number of decimals that an error is worth; negative for errors of hundreds and more.

    Two digits of the error when its first three are 100 to 354, one when they are 355 to 949, and 1000 above.

    Source:
        Particle Data Group, Review of Particle Physics, introduction, "Rounding"; from memory.
    """
    if not (math.isfinite(error) and error > 0.0):
        return 4
    exponent = math.floor(math.log10(error))
    leading = round(error / 10.0 ** (exponent - 2))
    if leading >= 1000:
        exponent, leading = exponent + 1, 100
    return (1 if leading <= 354 else 0) - exponent


def fixed(value: float, decimals: int) -> str:
    """Return a number with so many decimals, thousands grouped; negative decimals round to tens and up.

    From 10^16 on double precision has no digit left for a unit: then six digits and the power of ten.
    """
    if not math.isfinite(value):
        return "no number"
    if abs(value) >= _MEANINGLESS:
        return significant(value, 6)
    rounded = round(value, decimals)
    text = f"{rounded:,.{max(decimals, 0)}f}"
    if text.strip("-0.,") == "":
        text = text.lstrip("-")
    return text.replace("-", "−")


def significant(value: float, digits: int = 3) -> str:
    """Return a number with so many significant digits, by its power of ten where that is shorter to read."""
    if value == 0.0 or not math.isfinite(value):
        return "0" if value == 0.0 else "no number"
    exponent = math.floor(math.log10(abs(value)))
    if round(abs(value) / 10.0**exponent, digits - 1) >= 10.0:
        exponent += 1
    if -5 <= exponent < 6:
        return fixed(value, digits - 1 - exponent)
    return f"{fixed(value / 10.0**exponent, digits - 1)} × 10^{_power(exponent)}"


def as_written(value: float) -> str:
    """Return a number as a person would type it: 30, 0.5, 3.2e18, 1.2e−7; never padded with zeros."""
    mantissa, mark, power = f"{value:.10g}".partition("e")
    return (mantissa + mark + (str(int(power)) if mark else "")).replace("-", "−")


def count(number: float) -> str:
    """Return a whole number with its thousands grouped."""
    return f"{round(number):,}".replace("-", "−")


def with_error(value: float, error: float | None) -> str:
    """Return "value ± error" with matching digits; "value (exact)" when the error is 0.

    Args:
        value: the number.
        error: one standard error of it; None when there is none to show.
    """
    if error is None or not math.isfinite(error):
        return significant(value, 4)
    if error <= 0.0:
        return f"{fixed(value, 4)} (exact)"
    size = max(abs(value), error)
    if 1e-4 <= size < 1e6:
        most = _MOST_DIGITS - 1 - math.floor(math.log10(size))
        decimals = min(decimals_for(error), max(most, 4), 8)
        return f"{fixed(value, decimals)} ± {_size(error, decimals)}"
    exponent = math.floor(math.log10(size))
    return _with_power(value / 10.0**exponent, error / 10.0**exponent, exponent)


def _with_power(value: float, error: float, exponent: int) -> str:
    decimals = max(min(decimals_for(error), _MOST_DIGITS - 1), 0)
    return f"({fixed(value, decimals)} ± {_size(error, decimals)}) × 10^{_power(exponent)}"


def _size(error: float, decimals: int) -> str:
    """Return an error as text; one that so many decimals can't show as below the last of them."""
    return f"<{10.0**-decimals:.{decimals}f}" if error < 10.0**-decimals else fixed(error, decimals)


def ln_with_error(value: float, error: float) -> str:
    """Return "value ± error" of a logarithm, whose decimals mean the same at whatever size: at most four.

    Args:
        value: ln of an evidence or of a Bayes factor [nats], or log10 of one.
        error: one standard error of it; 0 where it is exact.
    """
    (text,) = with_errors([value], [error])
    return text


def with_errors(values: Sequence[float], errors: Sequence[float]) -> list[str]:
    """Return several "value ± error" with the same decimals, four at most, to compare down a column.

    Args:
        values: the numbers.
        errors: one standard error of each; 0 where it is exact.
    """
    known = [error for error in errors if error > 0.0]
    least = min((decimals_for(error) for error in known), default=4)
    needed = max((-math.floor(math.log10(error)) for error in known), default=4)
    decimals = min(max(least, needed, 0), _MOST_DECIMALS_OF_LN)
    return [
        f"{fixed(value, decimals)} ± {_size(error, decimals)}"
        if error > 0.0
        else f"{fixed(value, decimals)} (exact)"
        for value, error in zip(values, errors, strict=True)
    ]


def with_sides(value: float, low: float | None, high: float | None) -> str:
    """Return "value +high −low" with two digits of the smaller error; says where one side has none.

    Args:
        value: the number.
        low: its error downwards, negative; None where there is none.
        high: its error upwards; None where there is none.
    """
    size = max(abs(value), abs(low or 0.0), abs(high or 0.0))
    decimals = _two_digits([low, high])
    is_plain = size == 0.0 or _LEAST_PLAIN <= size < _MEANINGLESS
    texts = [
        fixed(one, decimals) if is_plain else significant(one)
        for one in (value, high or 0.0, abs(low or 0.0))
    ]
    up = f"+{texts[1]}" if high is not None else "no error above"
    down = f"−{texts[2]}" if low is not None else "no error below"
    return f"{texts[0]} {up} {down}"


def with_two_digits(value: float, error: float, least: int = 0) -> str:
    """Return "value ± error" with two digits of the error, for parameters listed below each other.

    Args:
        value: the number.
        error: one standard error of it.
        least: decimals at least, for numbers of one scale, so that 0.99 and 1.01 are written alike.
    """
    if not _LEAST_PLAIN <= max(abs(value), error) < _MEANINGLESS:
        return with_error(value, error)
    decimals = max(_two_digits([error]), least)
    return f"{fixed(value, decimals)} ± {fixed(error, decimals)}"


def _two_digits(errors: Sequence[float | None]) -> int:
    sizes = [abs(error) for error in errors if error]
    return max((min(1 - math.floor(math.log10(size)), 10) for size in sizes), default=4)


def factor(ln_value: float, ln_error: float | None = None) -> str:
    """Return exp(ln_value) as text, with its error where one is given, however large or small.

    Args:
        ln_value: logarithm of the number, which itself may be far outside what a float holds [nats].
        ln_error: one standard error of it [nats]; 0 for a number shown to three digits, None for a choice
            shown as short as it is.
    """
    has_error = ln_error is not None and ln_error > 0.0
    if _PLAIN_ABOVE <= ln_value < _PLAIN_BELOW:
        value = math.exp(ln_value)
        if ln_error is not None and has_error and ln_error < 1.0:
            return with_error(value, value * ln_error)
        return trimmed(value) if ln_error is None else significant(value)
    exponent = math.floor(ln_value / _LN_10 + 1e-12)
    mantissa = math.exp(ln_value - exponent * _LN_10)
    if not (ln_error is not None and has_error and ln_error < 1.0):
        return _by_power(mantissa, exponent)
    return _with_power(mantissa, mantissa * ln_error, exponent)


def _by_power(mantissa: float, exponent: int) -> str:
    if round(mantissa, 1) >= 10.0:
        mantissa, exponent = 1.0, exponent + 1
    power = f"10^{_power(exponent)}"
    return power if abs(mantissa - 1.0) < 1e-9 else f"{fixed(mantissa, 1)} × {power}"


def trimmed(value: float, digits: int = 3) -> str:
    """Return a number with at most so many significant digits, no zeros at its end: 10, 1, 9.09, 2,240."""
    if value >= 10.0**digits:
        return significant(value, digits)
    text = significant(value, digits)
    return text.rstrip("0").rstrip(".") if "." in text and "×" not in text else text


def odds(ln_odds: float, ln_error: float | None = None) -> str:
    """Return odds as "7.7 : 1" or "1 : 9.1", the side that is favoured with its number.

    Args:
        ln_odds: logarithm of the odds [nats].
        ln_error: one standard error of it [nats], 0 where there is none to show; None where the odds are a
            choice and not a result.
    """
    if ln_odds >= -1e-12:
        return f"{factor(max(ln_odds, 0.0), ln_error)} : 1"
    return f"1 : {factor(-ln_odds, ln_error)}"


def probability(value: float, rest: float, error: float | None = None) -> str:
    """Return a probability; one that is nearly 1 as 1 minus what is left.

    Args:
        value: the probability.
        rest: 1 - value, summed from the other probabilities so that it keeps its digits.
        error: one standard error; None when there is none to show.
    """
    if value > 0.9995:
        if rest <= 0.0:
            return "1 (what is left is below 10^−300)"
        left = with_error(rest, error) if error else significant(rest, 3)
        return f"1 − ({left})" if "±" in left and not left.startswith("(") else f"1 − {left}"
    if value <= 0.0:
        return "below 10^−300"
    if error:
        return with_error(value, error)
    return fixed(value, 4).rstrip("0").rstrip(".") if value >= 1e-3 else trimmed(value)


def _power(exponent: int) -> str:
    if abs(exponent) < _MEANINGLESS:
        return str(exponent).replace("-", "−")
    return f"({significant(float(exponent))})"

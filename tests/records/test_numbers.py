"""Numbers as text: worked by hand, and held together by random numbers."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from workbench.records.numbers import (
    as_written,
    decimals_for,
    factor,
    fixed,
    ln_with_error,
    odds,
    probability,
    significant,
    trimmed,
    with_error,
    with_errors,
    with_sides,
    with_two_digits,
)


@pytest.mark.parametrize(
    ("value", "error", "text"),
    [
        (-167.29, 0.004, "−167.290 ± 0.004"),
        (7.7151, 0.0051, "7.715 ± 0.005"),
        (2240.0, 11.0, "2,240 ± 11"),
        (0.41, 0.035, "0.410 ± 0.035"),
        (3456.0, 700.0, "3,500 ± 700"),
        (0.0, 0.1, "0.00 ± 0.10"),
        (-0.001, 0.5, "0.0 ± 0.5"),
        (1234567.0, 350.0, "(1.23457 ± 0.00035) × 10^6"),
        (1e-7, 3e-9, "(1.000 ± 0.030) × 10^−7"),
        (5.0, 0.0, "5.0000 (exact)"),
        (1.0, 1e-13, "1.00000 ± <0.00001"),
    ],
)
def test_a_number_is_rounded_to_its_error(value: float, error: float, text: str) -> None:
    assert with_error(value, error) == text


@pytest.mark.parametrize(
    ("error", "decimals"),
    [
        (0.354, 2),
        (0.355, 1),
        (0.949, 1),
        (0.950, 1),
        (0.0999, 2),
        (0.12, 2),
        (3.0, 1),
        (35.0, 0),
        (400.0, -2),
    ],
)
def test_an_error_keeps_two_digits_up_to_354_and_one_up_to_949(error: float, decimals: int) -> None:
    assert decimals_for(error) == decimals


def test_numbers_below_each_other_share_their_decimals() -> None:
    assert with_errors([-43.2921, -35.575], [0.003, 0.004]) == ["−43.292 ± 0.003", "−35.575 ± 0.004"]
    assert with_errors([1.0, 2.0], [0.1, 0.001]) == ["1.000 ± 0.100", "2.000 ± 0.001"]
    assert with_errors([1.0, 2.0], [0.0, 0.02]) == ["1.000 (exact)", "2.000 ± 0.020"]


def test_a_logarithm_has_four_decimals_at_most() -> None:
    """An evidence in closed form stood beside "−19.10678538 ± 0.00000000"."""
    assert with_errors([-19.10678538, -19.1], [3e-12, 0.003]) == ["−19.1068 ± <0.0001", "−19.1000 ± 0.0030"]
    assert with_errors([-19.10678538], [1.2e-4]) == ["−19.1068 ± 0.0001"]
    assert ln_with_error(0.0123456, 2e-6) == "0.0123 ± <0.0001"
    assert ln_with_error(1.01417, 0.0) == "1.0142 (exact)"


def test_a_factor_has_six_digits_at_most() -> None:
    assert factor(math.log(2.7569123), 1e-7) == "2.75691 ± <0.00001"
    assert factor(math.log(0.027569123), 1e-7) == "0.0275691 ± <0.0000001"
    assert factor(2000.0, 1e-7) == "(3.88118 ± <0.00001) × 10^868"


def test_a_side_without_an_error_says_so() -> None:
    assert with_sides(50.04, -0.61, 0.63) == "50.04 +0.63 −0.61"
    assert with_sides(0.0, None, 0.34) == "0.00 +0.34 no error below"
    assert with_sides(5.0, -0.34, None) == "5.00 no error above −0.34"


@pytest.mark.parametrize(
    ("ln_odds", "ln_error", "text"),
    [
        (0.0, None, "1 : 1"),
        (math.log(10.0), None, "10 : 1"),
        (-math.log(10.0), None, "1 : 10"),
        (math.log(7.7), 0.005, "7.70 ± 0.04 : 1"),
        (-math.log(9.1), 0.01, "1 : 9.10 ± 0.09"),
        (9.0 * math.log(10.0), None, "10^9 : 1"),
        (2000.0, 0.05, "(3.88 ± 0.19) × 10^868 : 1"),
        (-2000.0, 0.05, "1 : (3.88 ± 0.19) × 10^868"),
        (math.log(9.999e8), None, "10^9 : 1"),
    ],
)
def test_odds_name_the_side_that_is_favoured(ln_odds: float, ln_error: float | None, text: str) -> None:
    assert odds(ln_odds, ln_error) == text


def test_a_small_bayes_factor_is_shown_by_its_power_of_ten() -> None:
    assert factor(-30.0, 0.1) == "(9.4 ± 0.9) × 10^−14"
    assert factor(math.log(0.11), 0.01) == "0.1100 ± 0.0011"


@pytest.mark.parametrize(
    ("value", "rest", "error", "text"),
    [
        (0.5, 0.5, None, "0.5"),
        (10 / 11, 1 / 11, None, "0.9091"),
        (1 / 11, 10 / 11, None, "0.0909"),
        (0.99556, 0.00444, 2e-5, "0.995560 ± 0.000020"),
        (1.0 - 1e-9, 1e-9, 1e-11, "1 − (1.000 ± 0.010) × 10^−9"),
        (1.0, 0.0, 0.0, "1 (what is left is below 10^−300)"),
        (0.0, 1.0, 0.0, "below 10^−300"),
        (1e-12, 1.0, 1e-14, "(1.000 ± 0.010) × 10^−12"),
    ],
)
def test_a_probability_near_one_is_told_by_what_is_left(
    value: float, rest: float, error: float | None, text: str
) -> None:
    assert probability(value, rest, error) == text


def test_numbers_are_not_padded_with_zeros() -> None:
    assert (as_written(30.0), as_written(-0.5), as_written(1.2e-7)) == ("30", "−0.5", "1.2e−7")
    assert as_written(3.2e18) == "3.2e18"
    assert (trimmed(10.0), trimmed(9.094), trimmed(2240.0)) == ("10", "9.09", "2,240")
    assert (significant(999.96, 4), significant(0.0), fixed(float("nan"), 2)) == ("1,000", "0", "no number")


@given(
    st.floats(-1e5, 1e5).filter(lambda x: abs(x) > 1e-3),
    st.floats(1e-3, 1e3),
)
def test_what_is_shown_is_the_number_to_within_its_error(value: float, error: float) -> None:
    shown, _, shown_error = with_error(value, error).replace(",", "").replace("−", "-").partition(" ± ")
    assert abs(float(shown) - value) <= 0.5 * error
    assert float(shown_error) == pytest.approx(error, rel=0.15)


@given(st.floats(-2500.0, 2500.0), st.one_of(st.none(), st.floats(1e-6, 0.5)))
def test_odds_read_back_are_the_odds(ln_odds: float, ln_error: float | None) -> None:
    text = odds(ln_odds, ln_error).replace(",", "").replace("−", "-")
    first, _, second = text.partition(" : ")
    number, sign = (first, 1.0) if second == "1" else (second, -1.0)
    mantissa, _, power = number.replace("(", "").replace(")", "").partition("10^")
    plain = mantissa.removesuffix(" × ").split(" ±")[0]
    read = math.log(float(plain or "1")) + math.log(10.0) * float(power or 0.0)
    assert sign * read == pytest.approx(ln_odds, abs=max(0.06, ln_error or 0.0))


def test_numbers_beyond_double_precision_are_shown_by_their_power_of_ten() -> None:
    """ln evidences of 10^157 once filled three lines with digits that mean nothing."""
    assert fixed(-1.2345678e157, 3) == "−1.23457 × 10^157"
    assert fixed(9007199254740992.0, 0) == "9,007,199,254,740,992"
    assert with_two_digits(3e-20, 1e-20) == "(3.0 ± 1.0) × 10^−20"
    assert with_sides(3e-20, -1e-20, None) == "3.00 × 10^−20 no error above −1.00 × 10^−20"
    assert odds(-1e160) == "1 : 10^(4.34 × 10^159)"

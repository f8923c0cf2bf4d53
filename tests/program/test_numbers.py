"""Number text and exact integers: nothing is lost, nothing is rounded that need not be, the style of a word is kept."""

from __future__ import annotations

from decimal import Decimal
from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gcodetool.program.numbers import (
    INCH_DIGIT,
    MM_DIGIT,
    QUANTA_PER_MM,
    decimal_to_quanta,
    decimals_of,
    digits,
    divide_half_even,
    exact,
    round_to_grid,
    shifted,
    to_quanta,
    write_quanta,
)

MM_PER_INCH = Fraction(254, 10)
"""The international inch is 25.4 mm exactly (common practice, no source)."""

PLAIN = st.from_regex(r"\A[+-]?(?:[0-9]{1,6}(?:\.[0-9]{0,9})?|\.[0-9]{1,9})\Z")
"""A real number as NISTIR 6556 3.3.2.1 allows it: sign, digits, at most one point, at least one digit."""


def value_of(text: str) -> Fraction:
    """The number as another reader takes it: Python's own, after the blanks are gone."""
    return Fraction(Decimal("".join(text.split())))


@st.composite
def spread(draw: st.DrawFn) -> str:
    """A number with blanks anywhere inside (NISTIR 6556 3.3: blanks outside comments mean nothing)."""
    text = draw(PLAIN)
    gaps = draw(st.lists(st.sampled_from(["", "", "", " ", "\t", "  "]), min_size=len(text), max_size=len(text)))
    return "".join(gap + character for gap, character in zip(gaps, text, strict=True))


# ---- reading ---------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("text", "value", "decimals"),
    [
        ("1", 1, 0),
        ("1.", 1, 0),
        ("-1.50", -150, 2),
        ("+.5", 5, 1),
        ("-.5", -5, 1),
        ("007", 7, 0),
        ("-0.000", 0, 3),
        (" 12", 12, 0),
        ("\t-\t3.5", -35, 1),
        ("+0. 12 34", 1234, 4),  # NISTIR 6556 3.3: x +0. 12 34 is x+0.1234
        ("1 . 5", 15, 1),
        ("12345678901234567890.123", 12345678901234567890123, 3),
    ],
)
def test_exact_reads_the_digits_as_written(text: str, value: int, decimals: int) -> None:
    assert exact(text) == (value, decimals)
    assert decimals_of(text) == decimals


@pytest.mark.parametrize("text", ["", ".", "-", "+.", "  ", "1.2.3", "--1", "1e3", "#1"])
def test_what_is_no_number_raises(text: str) -> None:
    """NISTIR 6556 3.3.2.1: at least one digit, at most one point, no exponent."""
    with pytest.raises(ValueError):
        exact(text)


@given(spread())
def test_exact_agrees_with_decimal(text: str) -> None:
    value, decimals = exact(text)
    assert Fraction(value, 10**decimals) == value_of(text)


@given(spread())
def test_quanta_in_mm_and_inch_are_exact(text: str) -> None:
    value = value_of(text)
    assert Fraction(to_quanta(text, MM_DIGIT), QUANTA_PER_MM) == value
    assert Fraction(to_quanta(text, INCH_DIGIT), QUANTA_PER_MM) == value * MM_PER_INCH


@pytest.mark.parametrize(
    ("text", "quanta"),
    [
        ("0.00000000005", 0),  # half a quantum: to the even one
        ("0.00000000015", 2),
        ("-0.00000000015", -2),
        ("0.000000000149", 1),
        ("0.00000000000000000000000000000000001", 0),
    ],
)
def test_digits_below_a_quantum_are_rounded_half_to_even(text: str, quanta: int) -> None:
    assert to_quanta(text, MM_DIGIT) == quanta


def test_a_program_of_words_adds_up_exactly() -> None:
    """Ten thousand steps of 0.0001 inch are one inch; a sum of floats is not."""
    step = to_quanta("0.0001", INCH_DIGIT)
    assert 10_000 * step == to_quanta("25.4", MM_DIGIT)
    assert sum([0.0001] * 10_000) != 1.0


@pytest.mark.parametrize(
    ("value", "quanta"), [("0.12", 1_200_000_000), ("0", 0), ("1E-10", 1), ("25.4", 254_000_000_000)]
)
def test_decimal_to_quanta(value: str, quanta: int) -> None:
    assert decimal_to_quanta(Decimal(value)) == quanta


# ---- rounding --------------------------------------------------------------------------------------------------------


@given(st.integers(-(10**15), 10**15), st.integers(1, 10**12))
def test_divide_half_even_is_the_rounding_of_fractions(value: int, by: int) -> None:
    """Python rounds a Fraction half to even."""
    assert divide_half_even(value, by) == round(Fraction(value, by))


@given(st.integers(-(10**14), 10**14), st.integers(0, 9), st.booleans())
def test_round_to_grid_gives_the_nearest_number_that_can_be_written(quanta: int, decimals: int, inch: bool) -> None:
    digit = INCH_DIGIT if inch else MM_DIGIT
    rounded = round_to_grid(quanta, digit, decimals)
    assert rounded % digit[decimals] == 0
    assert 2 * abs(rounded - quanta) <= digit[decimals]
    assert round_to_grid(rounded, digit, decimals) == rounded


# ---- writing ---------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("value", "decimals", "like", "text"),
    [
        (15, 1, "3.0", "1.5"),
        (5, 1, "0.1", "0.5"),
        (5, 1, ".1", ".5"),
        (-5, 1, ".1", "-.5"),
        (-5, 1, "-0.1", "-0.5"),
        (5, 1, "+1", "+0.5"),
        (5, 1, "+.1", "+.5"),
        (-5, 1, "+1", "-0.5"),
        (0, 2, "-1", "0.00"),  # never a minus zero
        (0, 2, "-.5", ".00"),
        (0, 0, "-1", "0"),
        (7, 0, "1", "7"),
        (100_001, 4, "1", "10.0001"),
    ],
)
def test_digits_keeps_the_style(value: int, decimals: int, like: str, text: str) -> None:
    assert digits(value, decimals, like) == text


@given(st.integers(-(10**12), 10**12), st.integers(0, 9), PLAIN)
def test_what_is_written_reads_back_as_the_same_number(value: int, decimals: int, like: str) -> None:
    text = digits(value, decimals, like)
    assert exact(text) == (value, decimals)
    assert not text.startswith("-") or value < 0


@given(st.integers(-(10**12), 10**12), st.integers(0, 9), st.booleans())
def test_write_quanta_is_the_inverse_of_reading(steps: int, decimals: int, inch: bool) -> None:
    digit = INCH_DIGIT if inch else MM_DIGIT
    text = write_quanta(steps * digit[decimals], digit, decimals)
    assert to_quanta(text, digit) == steps * digit[decimals]


# ---- shifting --------------------------------------------------------------------------------------------------------

TENTH = QUANTA_PER_MM // 10


@pytest.mark.parametrize(
    ("text", "add", "least", "result"),
    [
        ("10", TENTH, 4, "10.1000"),
        ("10.", TENTH, 4, "10.1000"),
        ("10.000", TENTH, 4, "10.1000"),
        ("10.123456", TENTH, 4, "10.223456"),  # its own decimals are kept
        ("+10", TENTH, 4, "+10.1000"),
        (".5", TENTH, 4, ".6000"),
        ("-.05", TENTH, 4, ".0500"),  # through zero
        ("-0.05", TENTH, 4, "0.0500"),
        ("0", -TENTH, 4, "-0.1000"),
        ("-0.1", TENTH, 4, "0.0000"),
        (" 10", TENTH, 4, " 10.1000"),  # blanks between letter and number stay
        ("9.95", TENTH, 4, "10.0500"),
        ("1 0 . 5", TENTH, 4, "10.6000"),
    ],
)
def test_shifted_table(text: str, add: int, least: int, result: str) -> None:
    assert shifted(text, add, MM_DIGIT, least) == (result, add)


def test_an_inch_word_is_shifted_by_the_lash_on_the_inch_grid() -> None:
    """0.1 mm is 0.0039370... in, on the grid of 5 decimals 0.00394 in."""
    lash = round_to_grid(decimal_to_quanta(Decimal("0.1")), INCH_DIGIT, 5)
    assert shifted("1.5", lash, INCH_DIGIT, 5) == ("1.50394", lash)


@given(PLAIN, st.integers(-(10**7), 10**7), st.integers(4, 8), st.booleans())
def test_a_shift_on_the_grid_is_exact_and_can_be_taken_back(text: str, steps: int, least: int, inch: bool) -> None:
    digit = INCH_DIGIT if inch else MM_DIGIT
    add = steps * digit[least]
    there, added = shifted(text, add, digit, least)
    assert added == add
    assert to_quanta(there, digit) == to_quanta(text, digit) + add
    assert decimals_of(there) >= max(least, decimals_of(text))
    back, _ = shifted(there, -add, digit, least)
    assert value_of(back) == value_of(text)


@given(PLAIN, st.integers(-(10**11), 10**11), st.integers(4, 8))
def test_a_shift_off_the_grid_says_what_it_really_added(text: str, add: int, least: int) -> None:
    there, added = shifted(text, add, MM_DIGIT, least)
    assert to_quanta(there, MM_DIGIT) == to_quanta(text, MM_DIGIT) + added
    assert 2 * abs(added - add) <= MM_DIGIT[max(least, decimals_of(text))]

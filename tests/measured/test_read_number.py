"""One text, one meaning: what the strict reader takes and what it refuses."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from programme.measured import Refused, read_number


@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("0.02", 0.02),
        (" 22 ", 22.0),
        ("\u221240", -40.0),
        ("+5", 5.0),
        ("1.234", 1.234),
        (".5", 0.5),
        ("1e-6", 1e-6),
        ("6.02E23", 6.02e23),
        ("-0", 0.0),
        ("0e-999", 0.0),
        (7, 7.0),
        (0.25, 0.25),
    ],
)
def test_a_single_meaning_is_read(text, value):
    assert read_number(text) == value


@pytest.mark.parametrize(
    "text",
    [
        "NaN", "nan", "inf", "-Infinity", "1_000", "١٢", "１２", "½", "5%", "5 mg", "5mg/m3", "0x1F",
        "22 000", "22\u00a0000", "22\u2009000", "1,234,567", "1'000", "1,234.5", "1.2.3", "--5", "5-", "",
        "  ", "1e-400", "-4.9e-500", "1e400", "9" * 5000, "<0.02", "0,02", "1,234", "=1+1", "1 2", "5\x00",
        "\u22121e-400", "e5", ".", ",", "1e", "True", float("nan"), float("inf"), True,
    ],
)  # fmt: skip
def test_anything_else_is_refused_with_what_is_allowed(text):
    with pytest.raises(Refused) as refused:
        read_number(text)
    assert refused.value.allowed
    assert len(str(refused.value)) < 200


def test_the_refusal_reads_as_a_sentence():
    with pytest.raises(Refused, match=r"'1_000' is not a number that can be read; write digits"):
        read_number("1_000")


def test_the_thousands_separator_is_offered_without_it():
    with pytest.raises(Refused, match="leave out the thousands separator: 22000"):
        read_number("22 000")


@pytest.mark.parametrize("text", ["1.234", "1,234", "-12,500", "999.999"])
def test_either_mark_is_refused_with_both_readings_named(text):
    with pytest.raises(Refused) as refused:
        read_number(text, decimal="either")
    assert text.replace(",", ".") in str(refused.value)
    assert text.replace(",", "").replace(".", "") in str(refused.value)


@pytest.mark.parametrize(
    ("text", "value"),
    [("0,234", 0.234), ("0.234", 0.234), ("1,23", 1.23), ("1234,567", 1234.567), ("12", 12.0)],
)
def test_either_mark_is_read_where_only_one_meaning_is_left(text, value):
    assert read_number(text, decimal="either") == value


def test_a_declared_comma_is_the_decimal_mark():
    assert read_number("1,234", decimal="comma") == 1.234


@pytest.mark.parametrize(("text", "decimal"), [("1.234", "comma"), ("1,234", "point")])
def test_the_other_mark_before_three_digits_names_both_readings(text, decimal):
    with pytest.raises(Refused, match="can be read as 1.234 or as 1234"):
        read_number(text, decimal=decimal)


def test_the_other_mark_is_offered_rewritten():
    with pytest.raises(Refused, match="decimal mark is a point: write 0.02"):
        read_number("0,02")


def test_an_unknown_mark_is_refused():
    with pytest.raises(ValueError, match="decimal: 'dot' is not allowed"):
        read_number("1", decimal="dot")


def test_minus_zero_loses_its_sign():
    assert math.copysign(1, read_number("-0.0")) == 1


@given(st.floats(allow_nan=False, allow_infinity=False))
def test_every_float_comes_back_from_its_own_text(value):
    assert read_number(repr(value)) == value


@given(st.text(max_size=50))
def test_any_text_is_read_as_finite_or_refused(text):
    try:
        value = read_number(text, decimal="either")
    except Refused:
        return
    assert math.isfinite(value)

"""ISO always; anything else only where one reading is possible."""

from datetime import date, datetime

import pytest

from programme.measured import Refused, read_date

FOURTH_OF_MARCH = date(2026, 3, 4)


@pytest.mark.parametrize(
    "text",
    [
        "2026-03-04", "2026/3/4", "2026.03.04", "2026-03-04 10:30", "2026-03-04T10:30:00Z", "4 March 2026",
        "04-Mar-2026", "March 4, 2026", "Mar. 4 2026", " 2026-03-04 ", FOURTH_OF_MARCH,
        datetime(2026, 3, 4, 5),
    ],
)  # fmt: skip
def test_one_meaning_is_read(text):
    assert read_date(text) == FOURTH_OF_MARCH


@pytest.mark.parametrize(
    ("text", "order", "day"),
    [
        ("04/03/2026", "dmy", FOURTH_OF_MARCH),
        ("03/04/2026", "mdy", FOURTH_OF_MARCH),
        ("13.04.2026", None, date(2026, 4, 13)),
        ("04-13-2026", None, date(2026, 4, 13)),
        ("03/03/2026", None, date(2026, 3, 3)),
        ("2026-03-04", "mdy", FOURTH_OF_MARCH),
        ("29/02/2024", None, date(2024, 2, 29)),
    ],
)
def test_the_year_last_needs_an_order_only_where_two_days_are_possible(text, order, day):
    assert read_date(text, order=order) == day


@pytest.mark.parametrize(
    ("text", "order", "says"),
    [
        ("03/04/2026", None, "can be read as 2026-04-03 or as 2026-03-04"),
        ("13/04/2026", "mdy", "not a day of the calendar"),
        ("2023-02-29", None, "not a day of the calendar"),
        ("31/04/2026", None, "not a day of the calendar"),
        ("04/03/26", "dmy", "four digits"),
        ("4 Mar 26", None, "four digits"),
        ("0001-01-01", None, "1900 to 2100"),
        ("9999-12-31", None, "1900 to 2100"),
        ("46085", None, "not a date"),
        ("20260304", None, "not a date"),
        ("2026-03", None, "not a date"),
        ("", None, "is empty"),
        ("٢٠٢٦-٠٣-٠٤", None, "not a date"),
        ("4 Brumaire 2026", None, "not a date"),
        ("yesterday", None, "not a date"),
    ],
)
def test_any_other_date_is_refused_by_name(text, order, says):
    with pytest.raises(Refused, match=says):
        read_date(text, order=order)


def test_an_unknown_order_is_refused():
    with pytest.raises(ValueError, match="order: 'ymd' is not allowed"):
        read_date("2026-03-04", order="ymd")

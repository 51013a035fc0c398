"""How long a fit test counts."""

from datetime import date, timedelta

import pytest
from hypothesis import given
from hypothesis import strategies as st

from programme.fit.validity import last_lapsed_day, shorter_months
from programme.roster.months import months_after


@pytest.mark.parametrize(
    ("day", "months", "later"),
    [
        (date(2026, 3, 4), 12, date(2027, 3, 4)),
        (date(2024, 2, 29), 12, date(2025, 2, 28)),
        (date(2025, 8, 31), 6, date(2026, 2, 28)),
        (date(2025, 12, 15), 1, date(2026, 1, 15)),
        (date(2026, 1, 31), -2, date(2025, 11, 30)),
    ],
    ids=["a year", "leap day", "short month", "over new year", "backwards"],
)
def test_months_keep_the_day_or_take_the_last_of_a_shorter_month(day, months, later):
    assert months_after(day, months) == later


@given(st.dates(date(1990, 1, 1), date(2090, 1, 1)), st.integers(1, 36))
def test_the_last_lapsed_day_is_the_last_whose_test_no_longer_counts(on, months):
    day = last_lapsed_day(on, months)
    assert months_after(day, months) <= on < months_after(day + timedelta(days=1), months)


@pytest.mark.parametrize(
    ("pack", "site", "months"), [(12, None, 12), (12, 6, 6), (12, 24, 12), (None, 6, 6)]
)
def test_a_site_shortens_the_interval_and_never_lengthens_it(pack, site, months):
    assert shorter_months(pack, site) == months

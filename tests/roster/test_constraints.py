"""What the database refuses of people, whoever writes."""

from datetime import timedelta
from math import inf, nan

import pytest
from django.db import IntegrityError, transaction

from programme.roster.models import Clearance, Worker
from tests.builders import SINCE, make_clearance, make_site, make_worker

pytestmark = pytest.mark.django_db


def test_nobody_leaves_on_or_before_the_first_day():
    with pytest.raises(IntegrityError):
        make_worker(active_from=SINCE, active_to=SINCE)


def test_nobody_is_born_on_or_after_the_first_day():
    with pytest.raises(IntegrityError):
        make_worker(active_from=SINCE, born_on=SINCE)


def test_a_bulk_load_cannot_slip_a_number_in_twice():
    site = make_site()
    rows = [
        Worker(site=site, personnel_number="A", name=name, active_from=SINCE) for name in ("a", "b")
    ]
    with pytest.raises(IntegrityError):
        Worker.objects.bulk_create(rows)


def test_a_clearance_does_not_end_before_it_begins():
    with pytest.raises(IntegrityError):
        make_clearance(make_worker(), expires_on=SINCE - timedelta(days=1))


@pytest.mark.parametrize("hours", [0.0, -1.0, 24.1, 1e9, inf, -inf, nan])
def test_hours_a_shift_are_within_a_day(hours):
    worker = make_worker()
    try:
        with transaction.atomic():
            make_clearance(worker, max_hours_a_shift=hours)
    except (IntegrityError, ValueError):
        return
    # One of the databases keeps NaN as nothing at all: not a number, so no limit is read from it.
    assert Clearance.objects.get().max_hours_a_shift is None

"""The check digit of a CAS registry number."""

import csv

import pytest
from django.conf import settings

from exposure.cas import read_cas


def shipped():
    with (settings.FIXTURES_DIR / "agents.csv").open(encoding="utf-8", newline="") as lines:
        keys = [row["cas"] for row in csv.DictReader(lines)]
    return [key for key in keys if not key.startswith("NOCAS-")]


def test_every_shipped_number_has_its_check_digit():
    assert len(shipped()) == 180
    assert [read_cas(key) for key in shipped()] == shipped()


def test_a_wrong_check_digit_is_refused_with_the_right_one():
    with pytest.raises(ValueError, match=r"^CAS number: 71-43-3 .*must be 2 \(71-43-2\)"):
        read_cas("71-43-3")


@pytest.mark.parametrize(
    "text", ["", "7143-2", "71-43", "71-4-2", "a-43-2", "71-43-2-1", "７1-43-2"]
)
def test_what_is_no_number_of_that_form_is_refused(text):
    with pytest.raises(ValueError, match=r"^CAS number: .*for example 7439-92-1"):
        read_cas(text)


def test_two_digits_changed_round_are_found():
    # Lead, 7439-92-1, with two digits changed round.
    with pytest.raises(ValueError, match="look for a slip"):
        read_cas("7493-92-1")

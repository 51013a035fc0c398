"""What stands in the way of a fit test."""

from datetime import timedelta

import pytest

from programme.fit.readiness import hindrances
from programme.rulepack.load import load
from tests.builders import (
    DAY,
    make_clearance,
    make_facepiece,
    make_seal_note,
    make_worker,
)

pytestmark = pytest.mark.django_db


def says_of(worker, kind="half_mask"):
    facepiece = make_facepiece(worker.site, kind=kind)
    return [one.says for one in hindrances(worker, facepiece, pack=load("us-2026-1"), on=DAY)]


def test_nothing_stands_in_the_way_of_a_cleared_and_shaven_worker():
    worker = make_worker()
    make_clearance(worker)
    make_seal_note(worker, "clean_shaven")
    assert says_of(worker) == []


@pytest.mark.parametrize(
    ("fields", "says"),
    [
        ({"outcome": "not_able"}, "is not cleared. Ask the programme administrator."),
        ({"expires_on": DAY}, "was to be reviewed by 2026-03-02"),
    ],
    ids=["not able", "review due that day"],
)
def test_a_clearance_that_does_not_hold_stands_in_the_way(fields, says):
    worker = make_worker()
    make_clearance(worker, **fields)
    assert says in says_of(worker)[0]


def test_a_clearance_decided_later_does_not_count_yet():
    worker = make_worker()
    make_clearance(worker, on=DAY + timedelta(days=1))
    assert "has no clearance" in says_of(worker)[0]


def test_a_withdrawn_note_of_facial_hair_does_not_stand_in_the_way():
    worker = make_worker()
    make_clearance(worker)
    note = make_seal_note(worker)
    assert "Facial hair" in says_of(worker)[0]
    type(note).objects.update(withdrawn_at="2026-03-02T10:00Z")
    assert says_of(worker) == []


def test_spectacles_matter_to_a_full_facepiece_only():
    worker = make_worker(wears_spectacles=True)
    make_clearance(worker)
    assert says_of(worker) == []
    assert "lens insert" in says_of(worker, "full_facepiece")[0]

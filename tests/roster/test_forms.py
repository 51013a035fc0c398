"""What may be typed about people, and how a refusal reads."""

from datetime import date, timedelta

import pytest

from programme.roster.forms import ClearanceForm, SealNoteForm, TrainingForm, WorkerForm
from programme.roster.models import Worker
from tests.builders import DAY, SINCE, make_site, make_worker

pytestmark = pytest.mark.django_db


def worker_form(**typed):
    data = {"personnel_number": "W-77", "name": "Tom Farrow", "active_from": "2025-01-06"}
    return WorkerForm(data | typed, instance=Worker(site=make_site()), today=DAY)


def clearance_form(**typed):
    data = {"outcome": "able", "decided_on": "2026-01-05", "decided_by": "Dr Invented"}
    return ClearanceForm(data | typed, worker=make_worker(born_on=date(1990, 5, 1)), today=DAY)


def test_a_worker_is_read_as_typed():
    form = worker_form(job="Fitter", employer="Hired Hands", is_contractor="on")
    assert form.is_valid(), form.errors
    assert form.instance.active_from == date(2025, 1, 6)
    assert form.instance.is_contractor


def test_a_taken_personnel_number_is_refused_at_its_box_with_its_owner():
    make_worker(name="Ana Whitlock", personnel_number="W-77")
    message = worker_form().errors["personnel_number"][0]
    assert message.startswith("Personnel number: W-77 already belongs to Ana Whitlock")


def test_the_number_of_another_site_is_free():
    make_worker(make_site("south"), personnel_number="W-77")
    assert worker_form().is_valid()


@pytest.mark.parametrize(
    ("typed", "field", "says"),
    [
        ({"personnel_number": ""}, "personnel_number", "required"),
        ({"personnel_number": "=1+1"}, "personnel_number", "letters, digits"),
        ({"name": "   "}, "name", "required"),
        ({"name": "x" * 121}, "name", "121"),
        ({"active_from": "06/01/2025"}, "active_from", "say which comes first, day or month"),
        ({"active_from": "2025-02-30"}, "active_from", "2025-02-30 is not allowed"),
        ({"born_on": "2025-01-06"}, "born_on", "earlier than the first day, 2025-01-06"),
        ({"born_on": "1890-01-01"}, "born_on", "1890"),
        ({"born_on": "2027-01-01"}, "born_on", "2027-01-01 is not allowed"),
        ({"active_to": "2025-01-06"}, "active_to", "later than the first day, 2025-01-06"),
    ],
)
def test_a_refusal_names_field_value_and_what_is_allowed(typed, field, says):
    form = worker_form(**typed)
    assert not form.is_valid()
    assert says in form.errors[field][0]


def test_a_first_day_in_the_future_is_asked_about_and_taken_after_a_tick():
    start = str(DAY + timedelta(days=7))
    assert "lies in the future" in worker_form(active_from=start).errors["active_from"][0]
    assert worker_form(active_from=start, is_meant="on").is_valid()


@pytest.mark.parametrize(
    ("typed", "field", "says"),
    [
        ({"decided_on": "2026-03-03"}, "decided_on", "2026-03-03 lies in the future"),
        ({"decided_on": "1990-05-01"}, "decided_on", "was born on 1990-05-01"),
        ({"decided_on": "2019-05-01"}, "decided_on", "long before"),
        ({"expires_on": "2026-01-05"}, "expires_on", "later than 2026-01-05"),
        ({"max_hours_a_shift": "0"}, "max_hours_a_shift", "0 is not allowed; 0.25 to 24 h"),
        ({"max_hours_a_shift": "nan"}, "max_hours_a_shift", "nan is not allowed"),
        ({"max_hours_a_shift": "eight"}, "max_hours_a_shift", "eight is not allowed"),
        ({"outcome": "able_with_limits"}, "outcome", "needs at least one limit"),
        ({"outcome": "able", "no_scba": "on"}, "outcome", "able has no limits"),
        ({"outcome": "perhaps"}, "outcome", "perhaps"),
    ],
)
def test_a_clearance_that_cannot_be_is_refused(typed, field, says):
    form = clearance_form(**typed)
    assert not form.is_valid()
    assert says in form.errors[field][0]


def test_a_clearance_has_no_box_for_a_medical_detail():
    assert set(clearance_form().fields) == {
        "is_meant",
        "outcome",
        "decided_on",
        "expires_on",
        "decided_by",
        "no_negative_pressure",
        "no_scba",
        "heaviest_work",
        "max_hours_a_shift",
        "follow_up_needed",
        "copy_given",
    }


def test_a_seal_note_of_tomorrow_is_refused():
    data = {"noted_on": "2026-03-03", "kind": "facial_hair"}
    form = SealNoteForm(data, worker=make_worker(), today=DAY)
    assert "lies in the future" in form.errors["noted_on"][0]


def test_training_covers_only_families_of_the_rule_pack():
    data = {"trained_on": str(SINCE), "trainer": "T. Rainer", "families": ["moon_suit"]}
    families = [("scba", "scba")]
    form = TrainingForm(data, worker=make_worker(), today=DAY, families=families)
    assert "moon_suit" in form.errors["families"][0]


def test_a_correction_asks_for_its_reason():
    data = {"noted_on": str(DAY), "kind": "facial_hair"}
    form = SealNoteForm(data, worker=make_worker(), today=DAY, old=object())
    assert "reason" in form.errors

"""What may be done to workers and their papers."""

import pytest
from django.core.exceptions import PermissionDenied

from programme.ledger.models import Entry
from programme.roster import actions
from programme.roster.models import Clearance, SealNote, Training, Worker
from tests.builders import (
    DAY,
    SINCE,
    make_clearance,
    make_site,
    make_training,
    make_user,
    make_worker,
)

pytestmark = pytest.mark.django_db
REASON = "size misread on the sheet"


def new_worker(site, number="W-1"):
    return Worker(site=site, personnel_number=number, name="Ana Whitlock", active_from=SINCE)


def test_a_coordinator_adds_a_worker_and_the_ledger_says_so():
    site = make_site()
    worker = actions.add_worker(new_worker(site), by=make_user("coordinator", site))
    entry = Entry.objects.get()
    assert (entry.act, entry.subject_id) == ("worker added", str(worker.pk))


@pytest.mark.parametrize(
    ("role", "where"),
    [("manager", "north"), ("hygienist", "north"), ("coordinator", "south")],
    ids=["manager", "hygienist", "coordinator of another site"],
)
def test_nobody_else_adds_a_worker(role, where):
    user = make_user(role, make_site(where))
    with pytest.raises(PermissionDenied):
        actions.add_worker(new_worker(make_site()), by=user)
    assert not Worker.objects.at(make_site()).exists()


def test_a_personnel_number_that_is_taken_is_refused_by_name():
    site, user = make_site(), make_user()
    make_worker(site, personnel_number="W-1")
    with pytest.raises(ValueError, match=r"^Personnel number: W-1 is already taken"):
        actions.add_worker(new_worker(site), by=user)


def test_two_sites_may_use_the_same_personnel_number():
    make_worker(make_site("south"), personnel_number="W-1")
    assert actions.add_worker(new_worker(make_site()), by=make_user()).pk


def test_many_workers_are_stored_all_or_none():
    site, user = make_site(), make_user()
    rows = [new_worker(site, "A"), new_worker(site, "B"), new_worker(site, "A")]
    with pytest.raises(ValueError, match=r"^Personnel number"):
        actions.add_workers(rows, site=site, by=user)
    assert not Worker.objects.exists()
    assert (
        actions.add_workers([new_worker(site, "A"), new_worker(site, "B")], site=site, by=user) == 2
    )


def test_the_ledger_keeps_what_a_worker_was_called_before_but_no_date_of_birth():
    worker = make_worker(name="Ines Calder")
    worker.name, worker.born_on = "Ines Pell", SINCE.replace(year=1990)
    actions.change_worker(worker, by=make_user())
    detail = Entry.objects.get().detail
    assert detail["name"] == ["Ines Calder", "Ines Pell"]
    assert detail["born_on"] == "changed"


def test_a_change_of_nothing_is_not_entered():
    actions.change_worker(make_worker(), by=make_user())
    assert not Entry.objects.exists()


@pytest.mark.parametrize("role", ["hygienist", "manager"])
def test_only_a_coordinator_or_administrator_records_a_clearance(role):
    worker = make_worker()
    row = Clearance(worker=worker, outcome="able", decided_on=DAY, decided_by="Dr Invented")
    with pytest.raises(PermissionDenied):
        actions.record(row, by=make_user(role))
    assert actions.record(row, by=make_user("coordinator")).pk


def test_the_ledger_never_says_what_a_clearance_says():
    row = Clearance(worker=make_worker(), outcome="not_able", decided_on=DAY, decided_by="Dr I")
    actions.record(row, by=make_user())
    entry = Entry.objects.get()
    assert "able" not in f"{entry.says}{entry.detail}"


@pytest.mark.parametrize(
    "row",
    [
        Training(trained_on=DAY, trainer="T. Rainer"),
        SealNote(noted_on=DAY, kind="facial_hair"),
        Clearance(decided_on=DAY, outcome="able", decided_by="Dr Invented"),
    ],
    ids=["training", "seal note", "clearance"],
)
def test_nobody_of_another_site_records_a_paper(row):
    row.worker = make_worker()
    with pytest.raises(PermissionDenied):
        actions.record(row, by=make_user("administrator", make_site("south")))


def test_a_corrected_paper_stays_on_file_with_its_reason():
    old = make_training(make_worker())
    new = Training(trained_on=SINCE, trainer="T. Rainer")
    actions.replace(old, new, by=make_user(), reason=REASON)
    old.refresh_from_db()
    assert (old.replaced_by, old.change_reason, old.stands) == (new, REASON, False)
    assert list(Training.objects.in_force()) == [new]


def test_a_paper_corrected_twice_refuses_the_second():
    old, user = make_training(make_worker()), make_user()
    actions.replace(old, Training(trained_on=SINCE, trainer="A"), by=user, reason=REASON)
    with pytest.raises(ValueError, match="was replaced or withdrawn before"):
        actions.replace(old, Training(trained_on=SINCE, trainer="B"), by=user, reason=REASON)
    assert Training.objects.count() == 2


@pytest.mark.parametrize("reason", ["", "   ", "x", "typo"])
def test_a_correction_needs_a_reason_that_says_something(reason):
    row = make_clearance(make_worker())
    with pytest.raises(ValueError, match=r"^Reason: .* at least 8 characters"):
        actions.withdraw(row, by=make_user(), reason=reason)
    assert Clearance.objects.in_force().exists()


def test_a_withdrawn_paper_no_longer_counts_and_stays():
    row = make_clearance(make_worker())
    actions.withdraw(row, by=make_user(), reason="recorded for the wrong person")
    assert not Clearance.objects.in_force().exists()
    assert Entry.objects.get().reason == "recorded for the wrong person"


def test_a_refused_correction_leaves_no_trace():
    old = make_training(make_worker())
    with pytest.raises(PermissionDenied):
        actions.replace(
            old, Training(trained_on=DAY, trainer="A"), by=make_user("manager"), reason=REASON
        )
    assert not Entry.objects.exists()
    assert Training.objects.count() == 1

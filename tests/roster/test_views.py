"""The start page and the pages that change people."""

import pytest
from django.test import Client
from django.urls import reverse

from programme.roster.models import Clearance, SealNote, Training, Worker
from tests.builders import (
    DAY,
    client_for,
    make_clearance,
    make_site,
    make_training,
    make_user,
    make_worker,
)

pytestmark = pytest.mark.django_db
NEW = {"personnel_number": "W-77", "name": "Tom Farrow", "active_from": "2025-01-06"}
CLEARANCE = {"outcome": "able", "decided_on": str(DAY), "decided_by": "Dr Invented"}


def url(name, *args, code="north"):
    return reverse(f"roster:{name}", args=[code, *args])


def test_a_stranger_is_sent_to_sign_in():
    assert "/accounts/login/" in Client().get("/").url


@pytest.mark.parametrize(
    ("role", "page"),
    [
        ("coordinator", "selection:today"),
        ("hygienist", "exposure:samples"),
        ("manager", "records:records"),
        ("administrator", "selection:today"),
    ],
)
def test_each_role_starts_at_its_own_page(role, page):
    client = client_for(make_user(role, make_site()))
    assert client.get("/").url == reverse(page, args=["north"])


def test_a_user_of_two_sites_chooses_and_is_then_taken_to_the_last_one():
    user = make_user("coordinator", make_site())
    make_site("south").memberships.create(user=user, role="coordinator")
    client = client_for(user)
    text = client.get("/").content.decode()
    assert "North works" in text
    assert "South works" in text
    client.get(url("worker_add", code="south"))
    assert client.get("/").url == reverse("selection:today", args=["south"])
    assert "North works" in client.get("/?choose=1").content.decode()


def test_a_user_of_no_site_is_told_whom_to_ask():
    user = make_user(None, username="newcomer")
    text = client_for(user).get("/").content.decode()
    assert "Ask your programme administrator" in text
    assert "newcomer" in text


@pytest.mark.parametrize(
    ("role", "where", "status"),
    [("coordinator", "north", 302), ("hygienist", "north", 403), ("coordinator", "south", 404)],
    ids=["may", "may not", "of another site"],
)
def test_who_may_add_a_worker(role, where, status):
    make_site()
    client = client_for(make_user(role, make_site(where)))
    assert client.post(url("worker_add"), NEW).status_code == status
    assert Worker.objects.count() == (status == 302)


@pytest.mark.parametrize(
    ("role", "where", "status"),
    [("coordinator", "north", 302), ("manager", "north", 403), ("coordinator", "south", 404)],
    ids=["may", "may not", "of another site"],
)
@pytest.mark.parametrize(
    ("page", "data", "model"),
    [
        ("clearance_add", CLEARANCE, Clearance),
        ("training_add", {"trained_on": str(DAY), "trainer": "T. Rainer"}, Training),
        ("seal_note_add", {"noted_on": str(DAY), "kind": "facial_hair"}, SealNote),
    ],
    ids=["clearance", "training", "seal note"],
)
def test_who_may_record_a_paper(page, data, model, role, where, status):
    worker = make_worker()
    client = client_for(make_user(role, make_site(where)))
    assert client.post(url(page, worker.pk), data).status_code == status
    assert model.objects.count() == (status == 302)


def test_a_hygienist_may_not_even_open_the_clearance_form():
    client = client_for(make_user("hygienist", make_site()))
    assert client.get(url("clearance_add", make_worker().pk)).status_code == 403


def test_a_worker_of_another_site_is_not_found_under_ones_own():
    client = client_for(make_user("administrator", make_site()))
    stranger = make_worker(make_site("south"))
    for page in ("worker_change", "clearance_add", "training_add", "seal_note_add"):
        assert client.get(url(page, stranger.pk)).status_code == 404


def test_a_refused_form_keeps_what_was_typed():
    answer = client_for(make_user()).post(url("worker_add"), NEW | {"active_from": "2025-02-30"})
    text = answer.content.decode()
    assert answer.status_code == 422
    assert 'value="2025-02-30"' in text
    assert 'value="Tom Farrow"' in text


def test_a_worker_is_changed_without_touching_the_rest():
    worker = make_worker(name="Ines Calder", job="Fitter")
    data = {
        "personnel_number": worker.personnel_number,
        "name": "Ines Pell",
        "job": "Fitter",
        "active_from": str(worker.active_from),
    }
    client_for(make_user()).post(url("worker_change", worker.pk), data)
    worker.refresh_from_db()
    assert (worker.name, worker.job) == ("Ines Pell", "Fitter")


def test_a_clearance_is_corrected_with_a_reason_and_never_edited():
    old = make_clearance(make_worker())
    address = url("paper_correct", old.worker_id, "clearance", old.pk)
    client = client_for(make_user())
    assert client.post(address, CLEARANCE | {"reason": "x"}).status_code == 422
    client.post(address, CLEARANCE | {"reason": "date misread on the letter"})
    old.refresh_from_db()
    assert old.replaced_by.decided_on == DAY
    assert Clearance.objects.count() == 2


def test_a_correction_page_starts_from_what_is_on_file():
    old = make_training(make_worker(), note="in two languages")
    address = url("paper_correct", old.worker_id, "training", old.pk)
    assert 'value="in two languages"' in client_for(make_user()).get(address).content.decode()


def test_a_replaced_paper_leads_back_to_the_newest():
    new = make_training(make_worker())
    old = make_training(new.worker, replaced_by=new)
    address = url("paper_correct", old.worker_id, "training", old.pk)
    answer = client_for(make_user()).get(address)
    assert answer.url == new.worker.get_absolute_url()


def test_a_paper_is_withdrawn_with_a_reason():
    row = make_training(make_worker())
    address = url("paper_withdraw", row.worker_id, "training", row.pk)
    client_for(make_user()).post(address, {"reason": "it was somebody else's training"})
    assert not Training.objects.in_force().exists()


def test_a_paper_of_another_worker_is_not_found_under_this_one():
    row, other = make_training(make_worker()), make_worker()
    address = url("paper_correct", other.pk, "training", row.pk)
    assert client_for(make_user()).get(address).status_code == 404


def test_there_is_no_fourth_kind_of_paper():
    address = url("paper_correct", make_worker().pk, "questionnaire", 1)
    assert client_for(make_user()).get(address).status_code == 404


def test_a_name_is_never_run_as_markup():
    worker = make_worker(name="<script>alert(1)</script>")
    text = client_for(make_user()).get(url("worker_change", worker.pk)).content.decode()
    assert "<script>alert" not in text


@pytest.mark.parametrize(
    ("page", "entry"),
    [
        ("roster:worker_add", "People"),
        ("selection:people", "People"),
        ("selection:today", "Today"),
        ("selection:tasks", "Tasks"),
        ("fit:test_add", "Fit tests"),
    ],
)
def test_the_main_navigation_marks_one_entry(page, entry):
    client = client_for(make_user(site=make_site()))
    nav = client.get(reverse(page, args=["north"])).context["nav"]
    assert [one["label"] for one in nav if one["is_here"]] == [entry]

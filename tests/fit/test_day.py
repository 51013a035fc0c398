"""A day's paper of fit tests, entered as one sheet."""

import pytest
from django.urls import reverse

from programme.fit.models import FitTest
from programme.fit.outcome import slots_of
from programme.rulepack.load import load
from tests.builders import (
    DAY,
    client_for,
    make_facepiece,
    make_site,
    make_user,
    make_worker,
    size_of,
)

pytestmark = pytest.mark.django_db
PROTOCOL = "cnp_redon"


@pytest.fixture
def site():
    return make_site()


@pytest.fixture
def size(site):
    return size_of(make_facepiece(site))


@pytest.fixture
def ana(site):
    return make_worker(site, "Ana Whitlock")


@pytest.fixture
def bo(site):
    return make_worker(site, "Bo Pell")


def send(user, *rows, **fields):
    slots = slots_of(load("us-2026-1").protocol(PROTOCOL))
    data = {"tested_on": str(DAY), "tester": "F. Tester"} | fields
    for number, (worker, size, figure) in enumerate(rows, start=1):
        data[f"r{number}_worker"] = getattr(worker, "personnel_number", worker)
        data[f"r{number}_size"] = getattr(size, "pk", size)
        data |= {f"r{number}_{slot.key}": figure for slot in slots}
    address = reverse("fit:day", args=["north"]) + f"?protocol={PROTOCOL}"
    return client_for(user).post(address, data)


def test_a_sheet_of_two_people_is_stored_in_one_go(site, size, ana, bo):
    answer = send(make_user("hygienist", site), (ana, size, "900"), (bo, size, "40"))
    assert answer.status_code == 302
    assert set(FitTest.objects.values_list("worker__name", "outcome")) == {
        ("Ana Whitlock", "passed"),
        ("Bo Pell", "failed"),
    }


@pytest.mark.parametrize(
    ("row", "says"),
    [
        (("", "size", "900"), "Row 2, worker: give the personnel number"),
        (("W-nobody", "size", "900"), "W-nobody is nobody who works here"),
        (("bo", "", "900"), "Row 2: choose a facepiece and size"),
        (("bo", "size", "0"), "Row 2: Facing forward: 0 is not allowed"),
        (("bo", "size", "nan"), "Row 2: Facing forward: nan is not allowed"),
    ],
)
def test_one_bad_row_stores_nothing_and_is_named(site, size, ana, bo, row, says):
    known = {"bo": bo, "size": size}
    bad = tuple(known.get(part, part) for part in row)
    answer = send(make_user("hygienist", site), (ana, size, "900"), bad)
    assert answer.status_code == 422
    assert says.lower() in answer.content.decode().lower()
    assert not FitTest.objects.exists()


def test_the_same_row_twice_stores_nothing(site, size, ana):
    answer = send(make_user("hygienist", site), (ana, size, "900"), (ana, size, "900"))
    assert "nothing was stored" in answer.content.decode()
    assert not FitTest.objects.exists()


def test_a_worker_of_another_site_is_nobody_here(site, size):
    stranger = make_worker(make_site("south"))
    answer = send(make_user("hygienist", site), (stranger, size, "900"))
    assert answer.status_code == 422
    assert not FitTest.objects.exists()


def test_an_empty_sheet_says_so(site):
    assert "at least one row" in send(make_user("hygienist", site)).content.decode()


def test_working_out_a_sheet_stores_nothing(site, size, ana):
    answer = send(make_user("hygienist", site), (ana, size, "900"), work_out="1")
    assert answer.status_code == 200
    assert "Passed, 900 against 100." in answer.content.decode()
    assert not FitTest.objects.exists()


@pytest.mark.parametrize(
    ("role", "where", "status"), [("manager", "north", 403), ("hygienist", "south", 404)]
)
def test_nobody_else_stores_a_sheet(site, size, ana, role, where, status):
    answer = send(make_user(role, make_site(where)), (ana, size, "900"))
    assert answer.status_code == status
    assert not FitTest.objects.exists()

"""Addresses and boxes with what nobody means: an answer, never a crash."""

import pytest

from tests.builders import client_for, make_site, make_task, make_task_agent, make_user

pytestmark = pytest.mark.django_db
BIG = "9" * 30


@pytest.mark.parametrize(
    "address",
    [
        f"samples/?task={BIG}",
        f"samples/?agent={BIG}",
        f"samples/?page={BIG}",
        "samples/?q=%00",
        f"samples/{BIG}/",
        f"samples/agents/{BIG}/",
        "samples/agents/?q=%00",
        f"samples/agents/?q={'x' * 5000}",
        f"samples/new/?task_agent={BIG}",
        f"samples/new/?worker={BIG}",
        f"samples/new/?task={BIG}",
        "samples/new/?task=%D9%A3",
        f"respirators/{BIG}/",
        "respirators/?q=%00",
        f"respirators/new/?facepiece={BIG}",
        f"respirators/changes/?worker={BIG}",
        f"respirators/changes/?assembly={BIG}",
        f"respirators/changes/new/?worker={BIG}",
    ],
)
def test_an_odd_address_is_answered_or_not_found(address):
    make_task_agent(make_task(make_site()))
    answer = client_for(make_user("administrator")).get(f"/s/north/{address}")
    assert answer.status_code in {200, 404}


@pytest.mark.parametrize(
    "fields",
    [
        {"task_agent": BIG},
        {"worker": BIG},
        {"task_agent": "\x00"},
        {"result": "\x00"},
        {"note": "\x00"},
        {"reference": "\x00"},
        {"minutes": "1" * 400},
        {"sampled_on": "0001-01-01"},
    ],
    ids=str,
)
def test_an_odd_box_is_refused(fields):
    group = make_task_agent(make_task(make_site()))
    typed = {"task_agent": group.pk, "sampled_on": "2026-03-02", "where": "personal"}
    typed |= {"span": "full", "result": "0.3", "unit": "mg/m3"}
    page = client_for(make_user("administrator"))
    assert page.post("/s/north/samples/new/", typed | fields).status_code == 422

"""People as the chain judges them: list, page and pocket card."""

from datetime import date, timedelta

import pytest
from django.urls import reverse

from programme.roster.actions import record
from programme.roster.models import Clearance
from programme.selection.chain import HOLDS, LINKS, Chain, CrewVerdict, Link, Mismatch, Remedy
from programme.selection.person import saying_of
from tests.builders import (
    DAY,
    client_for,
    make_assembly,
    make_clearance,
    make_crew,
    make_fit_test,
    make_seal_note,
    make_site,
    make_task,
    make_training,
    make_user,
    make_worker,
)

LIMIT = "not to wear a negative-pressure respirator"


def make_verdict(*, may_start=False, is_medical=True, mismatches=()):
    return CrewVerdict(
        worker_id=1,
        worker="Ana Whitlock",
        personnel_number="W-1",
        may_start=may_start,
        wears="half mask M, P100",
        fit_factor=812.0,
        good_until=date(2027, 3, 3),
        good_until_says="fit test",
        filter_due_on=None,
        filter_says="",
        mismatches=mismatches,
        is_medical=is_medical,
    )


def make_chain(*states):
    links = tuple(
        Link(name, state, "", "") for name, state in zip(LINKS, states or [HOLDS] * 6, strict=True)
    )
    return Chain("north", "North", 1, "t", "Relining", DAY, "us", "US", "1", links, ())


MEDICAL = Mismatch("medical-limits", "stop", "Face", LIMIT)
LAPSED = Mismatch(
    "fit-expired",
    "stop",
    "Face",
    "fit test lapsed",
    (Remedy("Record a fit test", "fit:test_add", (), "?worker=1"),),
)


def says_of(saying):
    return [reason.says for reason in saying.reasons]


def test_a_reader_without_the_right_is_told_to_ask_where_the_reason_is_medical():
    verdict = make_verdict(mismatches=(MEDICAL, LAPSED))
    assert says_of(saying_of(make_chain(), verdict, sees_medical=False)) == [
        "Ask the programme administrator.",
        LAPSED.says,
    ]
    assert says_of(saying_of(make_chain(), verdict, sees_medical=True)) == [LIMIT, LAPSED.says]


def test_a_reason_that_is_not_medical_is_told_to_everybody():
    verdict = make_verdict(is_medical=False, mismatches=(LAPSED,))
    assert says_of(saying_of(make_chain(), verdict, sees_medical=False)) == [LAPSED.says]


def test_a_break_of_the_task_itself_is_told_with_the_persons_own_reasons():
    chain = make_chain("broken", *[HOLDS] * 5)
    said = saying_of(chain, make_verdict(is_medical=False, mismatches=(LAPSED,)), sees_medical=True)
    assert says_of(said) == [LAPSED.says, "The chain of Relining breaks at Air."]


def test_a_no_is_never_left_without_a_word():
    said = saying_of(make_chain(), make_verdict(is_medical=False), sees_medical=True)
    assert len(said.reasons) == 1


def test_a_reason_comes_with_the_page_that_mends_it():
    said = saying_of(make_chain(), make_verdict(mismatches=(LAPSED,)), sees_medical=True)
    assert said.reasons[0].mends == (("Record a fit test", "/s/north/fit-tests/new/?worker=1"),)


def test_the_expiry_day_itself_no_longer_counts():
    verdict = make_verdict(may_start=True, is_medical=False)
    said = saying_of(make_chain(), verdict, sees_medical=True)
    assert said.through == verdict.good_until - timedelta(days=1)


def url(name, *args, code="north"):
    return reverse(f"selection:{name}", args=[code, *args])


@pytest.fixture
def crew(db):
    """A worker on a task in size M, tested on it, cleared and trained."""
    site = make_site()
    worker = make_worker(site, "Ana Whitlock", job="Fitter", personnel_number="W-100")
    assembly = make_assembly(site)
    member = make_crew(make_task(site, "Relining"), worker, assembly)
    make_fit_test(worker, member.size)
    make_clearance(worker)
    make_training(worker)
    return member


@pytest.mark.django_db
@pytest.mark.parametrize("page", ["person", "card"])
@pytest.mark.parametrize(
    ("who", "where", "status"),
    [("manager", "north", 200), ("coordinator", "south", 404), (None, "south", 404)],
    ids=["sees", "of another site", "of no site"],
)
def test_who_sees_a_person(page, who, where, status, crew):
    client = client_for(make_user(who, make_site(where)))
    assert client.get(url(page, crew.worker_id)).status_code == status


def test_the_page_says_what_may_be_done_and_lists_the_papers(crew):
    client = client_for(make_user("coordinator", crew.task.site))
    text = client.get(url("person", crew.worker_id) + "?on=2026-03-02").content.decode()
    for words in ("Relining", "Fit tests", "Clearance", "Training", "Seal notes", "History"):
        assert words in text
    assert "No diagnosis and no questionnaire is ever kept here" in text


def test_clearance_limits_are_not_shown_to_a_manager(crew):
    row = Clearance(
        worker=crew.worker,
        outcome="able_with_limits",
        decided_on=DAY,
        decided_by="Dr Invented",
        no_scba=True,
    )
    record(row, by=make_user("coordinator"))
    address = url("person", crew.worker_id) + "?on=2026-03-02"
    hygienist = client_for(make_user("hygienist")).get(address).content.decode()
    manager = client_for(make_user("manager")).get(address).content.decode()
    assert "no self-contained breathing apparatus" in hygienist
    assert "Dr Invented" not in manager
    assert "no self-contained breathing apparatus" not in manager
    assert "able with limits" not in manager


def test_a_medical_no_never_shows_its_reason_to_a_manager(crew):
    Clearance.objects.update(outcome="not_able")
    address = url("person", crew.worker_id) + "?on=2026-03-02"
    manager = client_for(make_user("manager")).get(address).content.decode()
    assert "Ask the programme administrator." in manager
    assert "not able" not in manager
    assert "not cleared" not in manager


def test_the_card_never_says_what_may_not_be_done_nor_why(crew):
    make_seal_note(crew.worker, "facial_hair")
    address = url("card", crew.worker_id) + "?on=2026-03-02"
    text = client_for(make_user()).get(address).content.decode()
    assert "facial hair" not in text.lower()
    assert "no card to print" in text


def test_the_history_tells_what_was_recorded(crew):
    record(
        Clearance(worker=crew.worker, outcome="able", decided_on=DAY, decided_by="Dr I"),
        by=make_user("coordinator", username="cora"),
    )
    text = client_for(make_user()).get(url("person", crew.worker_id)).content.decode()
    assert "clearance recorded" in text
    assert "by cora" in text


@pytest.mark.parametrize(
    ("query", "names"),
    [
        ("", {"Ana Whitlock", "Bo Pell"}),
        ("q=whit", {"Ana Whitlock"}),
        ("q=W-100", {"Ana Whitlock"}),
        ("q=hired", {"Bo Pell"}),
        ("whose=contractor", {"Bo Pell"}),
        ("whose=own", {"Ana Whitlock"}),
        ("state=left", {"Cy Farrow"}),
        ("state=coming", {"Di Calder"}),
        ("state=all", {"Ana Whitlock", "Bo Pell", "Cy Farrow", "Di Calder"}),
        ("ready=free", {"Bo Pell"}),
        ("state=x&ready=x&whose=x&sort=x&page=x", {"Ana Whitlock", "Bo Pell"}),
        ("q=%00", {"Ana Whitlock", "Bo Pell"}),
    ],
)
def test_the_list_shows_whom_the_filters_let_through(crew, query, names):
    site = crew.task.site
    make_worker(site, "Bo Pell", employer="Hired Hands", is_contractor=True)
    make_worker(site, "Cy Farrow", active_to=DAY)
    make_worker(site, "Di Calder", active_from=DAY + timedelta(days=1))
    make_worker(make_site("south"), "Stranger")
    answer = client_for(make_user()).get(f"{url('people')}?on=2026-03-02&{query}")
    assert {row.worker.name for row in answer.context["page"]} == names


@pytest.mark.parametrize(
    ("sort", "names"),
    [("name", ["Ana Whitlock", "Bo Pell"]), ("-name", ["Bo Pell", "Ana Whitlock"])],
)
def test_the_list_is_sorted_by_its_heads(crew, sort, names):
    make_worker(crew.task.site, "Bo Pell")
    answer = client_for(make_user()).get(f"{url('people')}?sort={sort}")
    assert [row.worker.name for row in answer.context["page"]] == names
    order = "descending" if sort.startswith("-") else "ascending"
    assert f'aria-sort="{order}"' in answer.content.decode()


def test_the_list_goes_out_as_csv_and_runs_no_formula(crew):
    make_worker(crew.task.site, "=1+1")
    text = client_for(make_user()).get(f"{url('people')}?format=csv").content.decode()
    assert "'=1+1" in text
    assert text.count("\r\n") == 3


@pytest.mark.django_db
def test_an_empty_roster_says_what_to_do():
    coordinator = client_for(make_user("coordinator")).get(url("people")).content.decode()
    assert "Add the first worker" in coordinator
    manager = client_for(make_user("manager")).get(url("people")).content.decode()
    assert "Ask the site safety coordinator" in manager


def test_the_list_costs_the_same_queries_for_3_and_30_people(crew, django_assert_max_num_queries):
    for number in range(30):
        make_worker(crew.task.site, f"Worker {number}")
    client = client_for(make_user())
    with django_assert_max_num_queries(40):
        client.get(url("people"))

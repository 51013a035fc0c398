"""Who may assign, what is refused and in which words, and what the ledger keeps of it."""

from datetime import timedelta

import pytest
from django.core.exceptions import PermissionDenied
from django.db import connection
from django.test.utils import CaptureQueriesContext

from programme.ledger.models import Entry
from programme.roster.models import Role
from programme.selection import actions
from programme.selection.assess import assess_site
from programme.selection.models import CrewMember, TaskAssembly
from tests import builders as b

pytestmark = pytest.mark.django_db
LATER = b.DAY + timedelta(days=9)


@pytest.fixture
def task():
    return b.make_task()


@pytest.fixture
def coordinator():
    return b.make_user(Role.COORDINATOR)


def assign(task, user):
    return actions.assign(task, b.make_assembly(task.site), since=b.DAY, by=user)


def end(task, user):
    row = b.assign(task, b.make_assembly(task.site))
    return actions.end_assignment(row, on=b.DAY, reason="recalled", by=user)


def put_on(task, user):
    worker, assembly = b.make_worker(task.site), b.make_assembly(task.site)
    size = b.size_of(assembly.facepiece)
    return actions.put_on_crew(task, worker, assembly=assembly, size=size, since=b.DAY, by=user)


def take_off(task, user):
    row = b.make_crew(task, b.make_worker(task.site))
    return actions.take_off_crew(row, on=b.DAY, by=user, reason="moved")


ACTIONS = [assign, end, put_on, take_off]
NAMES = {
    assign: "assembly assigned",
    end: "assembly taken off",
    put_on: "put on crew",
    take_off: "taken off crew",
}


@pytest.mark.parametrize("act", ACTIONS, ids=lambda one: one.__name__)
def test_the_coordinator_may_assign(act, task, coordinator):
    act(task, coordinator)
    assert Entry.objects.filter(act=NAMES[act]).exists()


@pytest.mark.parametrize("act", ACTIONS, ids=lambda one: one.__name__)
def test_a_manager_may_not_assign(act, task):
    with pytest.raises(PermissionDenied, match="assign assemblies and crews"):
        act(task, b.make_user(Role.MANAGER))
    assert not Entry.objects.exists()


@pytest.mark.parametrize("act", ACTIONS, ids=lambda one: one.__name__)
def test_the_administrator_of_another_site_may_not_assign(act, task):
    stranger = b.make_user(Role.ADMINISTRATOR, b.make_site("south"))
    with pytest.raises(PermissionDenied, match="no role here"):
        act(task, stranger)
    assert not Entry.objects.exists()


@pytest.mark.parametrize("act", ACTIONS, ids=lambda one: one.__name__)
def test_the_ledger_says_who_did_what_to_which_task(act, task, coordinator):
    act(task, coordinator)
    entry = Entry.objects.get()
    assert (entry.act, entry.chain, entry.by) == (NAMES[act], "north", coordinator.username)
    assert str(task) in entry.says


def test_an_assembly_of_another_site_is_refused(task, coordinator):
    other = b.make_assembly(b.make_site("south"))
    with pytest.raises(ValueError, match=r"^assembly: .* is not of North works$"):
        actions.assign(task, other, since=b.DAY, by=coordinator)


def test_an_assembly_is_assigned_once_at_a_time(task, coordinator):
    row = assign(task, coordinator)
    with pytest.raises(ValueError, match="assigned to Relining already"):
        actions.assign(task, row.assembly, since=LATER, by=coordinator)
    assert Entry.objects.count() == 1


def test_an_assembly_taken_off_may_be_assigned_again(task, coordinator):
    row = assign(task, coordinator)
    actions.end_assignment(row, on=LATER, reason="sent for repair", by=coordinator)
    actions.assign(task, row.assembly, since=LATER, by=coordinator)
    assert TaskAssembly.objects.active(LATER).count() == 1


@pytest.mark.parametrize("reason", ["", "   "], ids=["empty", "blank"])
def test_an_assignment_does_not_end_without_a_reason(reason, task, coordinator):
    row = assign(task, coordinator)
    with pytest.raises(ValueError, match="^reason: blank; say why"):
        actions.end_assignment(row, on=LATER, reason=reason, by=coordinator)


def test_an_assignment_ends_once(task, coordinator):
    row = assign(task, coordinator)
    actions.end_assignment(row, on=LATER, reason="recalled", by=coordinator)
    with pytest.raises(ValueError, match="has ended already$"):
        actions.end_assignment(row, on=LATER, reason="recalled", by=coordinator)
    assert Entry.objects.count() == 2


def test_an_end_is_the_first_day_without_and_never_before_the_start(task, coordinator):
    row = assign(task, coordinator)
    actions.end_assignment(row, on=b.DAY - timedelta(days=3), reason="wrong", by=coordinator)
    row.refresh_from_db()
    assert row.active_to == b.DAY
    assert not TaskAssembly.objects.active(b.DAY).exists()


def test_a_worker_of_another_site_is_not_put_on_a_crew(task, coordinator):
    stranger = b.make_worker(b.make_site("south"))
    with pytest.raises(ValueError, match="must be of North works$"):
        actions.put_on_crew(task, stranger, assembly=None, size=None, since=b.DAY, by=coordinator)


@pytest.mark.parametrize("has_assembly", [True, False], ids=["another facepiece", "no assembly"])
def test_a_size_belongs_to_the_facepiece_worn(has_assembly, task, coordinator):
    assembly = b.make_assembly(task.site) if has_assembly else None
    size = b.size_of(b.make_facepiece(task.site))
    with pytest.raises(ValueError, match="^size: .* is no size of"):
        actions.put_on_crew(
            task,
            b.make_worker(task.site),
            assembly=assembly,
            size=size,
            since=b.DAY,
            by=coordinator,
        )
    assert not CrewMember.objects.exists()


def test_a_change_of_what_is_worn_ends_the_old_row_and_keeps_it(task, coordinator):
    first = put_on(task, coordinator)
    actions.put_on_crew(task, first.worker, assembly=None, size=None, since=LATER, by=coordinator)
    first.refresh_from_db()
    assert (first.active_to, first.reason) == (LATER, "changed what is worn")
    assert CrewMember.objects.active(LATER).get().assembly is None
    assert list(Entry.objects.values_list("act", flat=True).order_by("pk")) == [
        "put on crew",
        "crew changed",
    ]


def test_nobody_is_taken_off_a_crew_twice(task, coordinator):
    row = put_on(task, coordinator)
    actions.take_off_crew(row, on=LATER, by=coordinator)
    with pytest.raises(ValueError, match="has ended already$"):
        actions.take_off_crew(row, on=LATER, by=coordinator)


def fill(site, *, tasks, workers):
    agent = b.make_agent()
    b.make_limit(agent)
    assembly = b.make_assembly(site)
    people = [b.make_worker(site) for _ in range(workers)]
    for one in people:
        b.make_clearance(one)
        b.make_training(one)
        b.make_seal_note(one, "clean_shaven")
        b.make_fit_test(one, b.size_of(assembly.facepiece))
        b.make_filter_change(one, assembly)
    for index in range(tasks):
        task = b.make_task(site)
        b.assign(task, assembly)
        b.make_sample(b.make_task_agent(task, agent))
        for one in people[index::tasks]:
            b.make_crew(task, one, assembly)


def queries_of(site, tasks):
    with CaptureQueriesContext(
        connection,
    ) as caught:
        chains = assess_site(site, on=b.DAY, with_choices=True)
    assert len(chains) == tasks
    return len(caught)


def test_a_site_of_any_size_is_judged_in_the_same_number_of_queries():
    small, large = b.make_site("small"), b.make_site("large")
    fill(small, tasks=3, workers=10)
    fill(large, tasks=30, workers=60)
    counts = queries_of(small, 3), queries_of(large, 30)
    assert counts[0] == counts[1]
    assert counts[0] <= 14

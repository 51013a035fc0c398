"""Forms of tasks and their agents: what is refused, what the ledger keeps, who may."""

import pytest
from django.core.exceptions import PermissionDenied
from django.db import IntegrityError, transaction
from django.urls import reverse

from exposure import actions
from exposure.models import Task, TaskAgent
from programme.ledger.models import Entry
from tests.builders import (
    client_for,
    make_agent,
    make_sample,
    make_site,
    make_task,
    make_task_agent,
    make_user,
)

pytestmark = pytest.mark.django_db
TASK = {
    "name": "Ladle relining",
    "code": "relining",
    "work_rate": "moderate",
    "wear_h_per_shift": "6",
    "shift_h": "8",
    "shifts_per_week": "5",
    "starts_at": "06:00",
    "oxygen": "ambient",
    "active_from": "2024-01-08",
}


def url(name, *args):
    return reverse(f"exposure:{name}", args=["north", *args])


def refusals(answer):
    assert answer.status_code == 422
    return " ".join(str(one) for errors in answer.context["form"].errors.values() for one in errors)


def row(**fields):
    return {"form": "particulate", "fraction": "respirable"} | fields


def test_a_task_is_added_and_leads_to_its_page(page, site):
    answer = page.post(url("task_add"), TASK)
    task = Task.objects.get()
    assert answer.url == task.get_absolute_url()
    assert (task.site, task.wear_h_per_shift, task.starts_at.hour) == (site, 6.0, 6)
    assert Entry.objects.get().act == "task added"


@pytest.mark.parametrize(
    ("fields", "says"),
    [
        ({"wear_h_per_shift": "9"}, "9 is not allowed; at most the shift, 8 h"),
        ({"wear_h_per_shift": "nan"}, "0.05 to 24"),
        ({"wear_h_per_shift": "25", "shift_h": "30"}, "0.05 to 24"),
        ({"shift_h": "inf"}, "0.25 to 24"),
        ({"shifts_per_week": "0"}, "0.1 to 21"),
        ({"shifts_per_week": "-5"}, "0.1 to 21"),
        ({"humidity_percent": "140"}, "0 to 100"),
        ({"temperature_c": "-300"}, "-40 to 80"),
        ({"oxygen": "measured"}, "Measured oxygen: empty; it must be 0 to 100 %"),
        ({"oxygen": "measured", "oxygen_percent": "120"}, "0 to 100"),
        ({"active_to": "2024-01-08"}, "it must be later than 2024-01-08"),
        ({"changed_on": "2030-01-01"}, "lies in the future"),
        ({"work_rate": "frantic"}, "frantic"),
        ({"code": "two words"}, "letters, numbers"),
        ({"code": "taken"}, "Code: taken already belongs to Tapping"),
        ({"name": ""}, "required"),
    ],
    ids=str,
)
def test_bad_input_for_a_task_is_refused_and_kept(page, site, fields, says):
    make_task(site, "Tapping", code="taken")
    answer = page.post(url("task_add"), TASK | {"description": "by the ladle"} | fields)
    assert says in refusals(answer)
    assert "by the ladle" in answer.content.decode()
    assert Task.objects.count() == 1


def test_a_change_of_a_task_keeps_what_stood_before(page, site):
    page.post(url("task_add"), TASK)
    task = Task.objects.get()
    page.post(url("task_edit", task.pk), TASK | {"shift_h": "12", "name": "Relining"})
    entry = Entry.objects.get(act="task changed")
    assert entry.detail == {
        "name": ["Ladle relining", "Relining"],
        "shift_h": ["8.0", "12.0"],
    }
    task.refresh_from_db()
    assert task.shift_h == 12


def test_saving_without_a_change_enters_nothing(page, site):
    page.post(url("task_add"), TASK)
    page.post(url("task_edit", Task.objects.get().pk), TASK)
    assert Entry.objects.count() == 1


def test_an_agent_is_added_to_a_task_with_its_size(page, site):
    task, agent = make_task(site), make_agent("Quartz", kind="dust")
    fields = {"mmad_um": "4", "gsd": "2.5", "size_source": "own cascade impactor, 2025"}
    answer = page.post(url("task_agent_add", task.pk), row(agent=agent.pk, **fields))
    one = TaskAgent.objects.get()
    assert answer.url == task.get_absolute_url()
    assert (one.agent, one.mmad_um, one.gsd) == (agent, 4.0, 2.5)


def test_a_typical_size_is_taken_over_with_its_source_and_mark(page, site):
    task, agent = make_task(site), make_agent("Iron", kind="dust")
    page.post(url("task_agent_add", task.pk), row(agent=agent.pk, typical="grind-metal"))
    one = TaskAgent.objects.get()
    assert (one.mmad_um, one.gsd) == (10.0, 3.0)
    assert one.size_source == "unconfirmed: general literature [grind-metal]"


def test_a_measured_size_goes_before_a_typical_one(page, site):
    task, agent = make_task(site), make_agent("Iron", kind="dust")
    own = {"mmad_um": "4", "gsd": "2", "size_source": "own", "typical": "grind-metal"}
    page.post(url("task_agent_add", task.pk), row(agent=agent.pk, **own))
    one = TaskAgent.objects.get()
    assert (one.mmad_um, one.gsd, one.size_source) == (4.0, 2.0, "own")


@pytest.mark.parametrize(
    ("kind", "fields", "says"),
    [
        ("dust", {"form": "gas"}, "is a dust; it must be particles or both"),
        ("gas", {"form": "particulate"}, "is a gas; it must be gas or vapour"),
        ("vapour", {"form": "gas"}, "it must be gas or vapour for this form"),
        ("dust", {"fraction": "vapour"}, "gas or vapour is not allowed for particles"),
        ("dust", {"mmad_um": "0", "size_source": "x"}, "0.001 to 100"),
        ("dust", {"mmad_um": "nan", "size_source": "x"}, "0.001 to 100"),
        ("dust", {"gsd": "0.5"}, "1 to 10"),
        ("dust", {"mmad_um": "4"}, "say where the diameter comes from"),
        ("dust", {"dust_load_mg_m3": "-1"}, "0 to 10000"),
        ("dust", {"agent": "999999"}, "is not known; choose one of the list"),
        ("dust", {"typical": "guess"}, "guess"),
    ],
    ids=str,
)
def test_bad_input_for_an_agent_in_a_task_is_refused(page, site, kind, fields, says):
    task, agent = make_task(site), make_agent("Stuff", kind=kind)
    answer = page.post(url("task_agent_add", task.pk), row(agent=agent.pk) | fields)
    assert says in refusals(answer)
    assert not TaskAgent.objects.exists()


def test_the_same_agent_and_fraction_twice_is_refused(page, group):
    answer = page.post(url("task_agent_add", group.task_id), row(agent=group.agent_id))
    assert "already" in refusals(answer)


def test_the_agent_of_a_row_and_a_sampled_fraction_cannot_be_changed(page, group):
    make_sample(group)
    lead = make_agent("Lead")
    page.post(url("task_agent_edit", group.pk), row(agent=lead.pk, fraction="total"))
    group.refresh_from_db()
    assert (group.agent.name, group.fraction) == ("Quartz", "respirable")


def test_an_agent_added_by_mistake_goes_with_a_reason_one_with_samples_stays(page, group, site):
    other = make_task_agent(group.task, make_agent("Lead"))
    make_sample(group)
    page.post(url("task_agent_remove", other.pk), {"reason": "wrong task was open"})
    assert "has samples" in refusals(
        page.post(url("task_agent_remove", group.pk), {"reason": "wrong task was open"})
    )
    assert list(TaskAgent.objects.all()) == [group]
    assert Entry.objects.get().act == "task agent removed"


def test_three_people_at_the_forms_of_tasks(page, group, site):
    manager = client_for(make_user("manager", site))
    stranger = client_for(make_user("hygienist", make_site("south")))
    pages = [
        url("task_add"),
        url("task_edit", group.task_id),
        url("task_agent_add", group.task_id),
        url("task_agent_edit", group.pk),
        url("task_agent_remove", group.pk),
    ]
    assert [page.get(one).status_code for one in pages] == [200] * 5
    assert [manager.get(one).status_code for one in pages] == [403] * 5
    assert [stranger.get(one).status_code for one in pages] == [404] * 5


def test_a_task_of_another_site_is_not_found(page):
    other = make_task_agent(make_task(make_site("south")))
    pages = [url("task_edit", other.task_id), url("task_agent_edit", other.pk)]
    assert [page.get(one).status_code for one in pages] == [404, 404]


def test_the_action_itself_asks_who_it_is_and_whose_agent_it_is(site, hygienist):
    task = make_task(site)
    with pytest.raises(PermissionDenied):
        actions.save_task(task, by=make_user("manager", site))
    theirs = make_agent("Southern dust", site=make_site("south"))
    with pytest.raises(ValueError, match="is not an agent of North works"):
        actions.save_task_agent(
            TaskAgent(task=task, agent=theirs, form="particulate", fraction="total"), by=hygienist
        )


BAD = [float("nan"), float("inf"), -1.0, 1e9]


@pytest.mark.parametrize("bad", BAD)
@pytest.mark.parametrize("field", ["wear_h_per_shift", "shift_h", "shifts_per_week"])
def test_the_database_itself_refuses_hours_that_cannot_be(site, field, bad):
    with pytest.raises(IntegrityError), transaction.atomic():
        make_task(site, **{field: bad})


@pytest.mark.parametrize("bad", BAD)
@pytest.mark.parametrize("field", ["mmad_um", "gsd"])
def test_the_database_itself_never_keeps_a_size_that_cannot_be(field, bad):
    try:
        with transaction.atomic():
            kept = make_task_agent(**{field: bad})
    except IntegrityError:
        return
    kept.refresh_from_db()
    assert getattr(kept, field) is None

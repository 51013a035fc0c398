"""Agents and limits: looked up with source and mark; a site adds its own, never loosens."""

import pytest
from django.core.exceptions import PermissionDenied
from django.db import IntegrityError, transaction
from django.urls import reverse

from exposure import actions
from exposure.models import Agent, ExposureLimit
from exposure.reference import load_reference
from programme.ledger.models import Entry
from tests.builders import (
    DAY,
    client_for,
    make_agent,
    make_limit,
    make_site,
    make_task,
    make_task_agent,
    make_user,
)

pytestmark = pytest.mark.django_db
AGENT = {
    "name": "Tarn green",
    "cas": "",
    "kind": "dust",
    "eye_irritant": "unknown",
    "skin_notation": "unknown",
    "filter_need": ["particulate"],
    "source": "maker's data sheet of 2025",
}
LIMIT = {
    "kind": "TWA",
    "fraction": "respirable",
    "value": "0.02",
    "unit": "mg/m3",
    "source": "site standard 4",
}


def url(name, *args):
    return reverse(f"exposure:{name}", args=["north", *args])


def refusals(answer):
    assert answer.status_code == 422
    return " ".join(str(one) for errors in answer.context["form"].errors.values() for one in errors)


def found(page, query):
    return [one.name for one in page.get(url("agents") + query).context["page"].object_list]


@pytest.fixture
def quartz(site):
    agent = make_agent("Quartz", key="14808-60-7", synonyms="crystalline silica", kind="dust")
    make_limit(agent, 0.05, sure="memory", source="29 CFR 1910.1053(c)")
    return agent


def test_an_agent_is_found_by_name_other_name_and_number(page, quartz):
    make_agent("Lead", key="7439-92-1")
    assert found(page, "?q=quar") == ["Quartz"]
    assert found(page, "?q=silica") == ["Quartz"]
    assert found(page, "?q=14808") == ["Quartz"]
    assert found(page, "") == ["Lead", "Quartz"]
    assert found(page, "?kind=gas") == []


def test_the_whole_start_up_list_is_shown_in_pages(page):
    load_reference()
    answer = page.get(url("agents"))
    assert answer.context["page"].paginator.count == 209
    assert "Page 1 of 3" in answer.content.decode()
    lines = page.get(url("agents") + "?format=csv").content.decode().splitlines()
    assert len(lines) == 1336


def test_every_shipped_agent_has_a_page(page):
    load_reference()
    for pk in Agent.objects.values_list("pk", flat=True):
        assert page.get(url("agent", pk)).status_code == 200


def test_each_limit_shows_its_source_and_an_unconfirmed_one_says_so(page, quartz):
    html = page.get(url("agent", quartz.pk)).content.decode()
    assert "29 CFR 1910.1053(c)" in html
    assert "unconfirmed" in html
    assert "held to here" in html


def test_an_agent_without_limits_says_what_that_breaks(page, site):
    html = page.get(url("agent", make_agent().pk)).content.decode()
    assert "No limit is known" in html


def test_a_site_adds_an_agent_with_its_source(page, site):
    answer = page.post(url("agent_add"), AGENT | {"cas": "71-43-2", "kind": "vapour"})
    agent = Agent.objects.get()
    assert answer.url == url("agent", agent.pk)
    assert (agent.key, agent.site, agent.sure) == ("71-43-2", site, "site")
    assert (agent.us_filter_need, agent.en_filter_need) == ("particulate", "")
    assert Entry.objects.get().act == "agent added"


def test_an_agent_without_a_number_gets_a_key_of_its_own(page):
    page.post(url("agent_add"), AGENT)
    assert (Agent.objects.get().key, Agent.objects.get().cas) == ("NOCAS-TARN-GREEN", "")


@pytest.mark.parametrize(
    ("fields", "says"),
    [
        ({"cas": "71-43-3"}, "the last one must be 2 (71-43-2)"),
        ({"cas": "14808-60-7"}, "is already there as Quartz"),
        ({"cas": "benzene"}, "for example 7439-92-1"),
        ({"source": ""}, "required"),
        ({"molar_mass_g_mol": "nan"}, "1 to 5000"),
        ({"molar_mass_g_mol": "0"}, "1 to 5000"),
        ({"idlh_value": "50"}, "give the value and its unit, or neither"),
        ({"idlh_value": "50", "idlh_unit": "ppm"}, "ppm is for gases and vapours"),
        ({"kind": "smoke"}, "smoke"),
        ({"filter_need": ["magic"]}, "magic"),
        ({"name": "quartz"}, "Another one is meant?"),
    ],
    ids=str,
)
def test_bad_input_for_an_agent_is_refused_by_name(page, quartz, fields, says):
    answer = page.post(url("agent_add"), AGENT | fields)
    assert says in refusals(answer)
    assert Agent.objects.count() == 1
    assert answer.context["form"]["name"].value() == (AGENT | fields)["name"]


def test_a_site_adds_a_stricter_limit_with_its_source(page, quartz, site):
    page.post(url("limit_add", quartz.pk), LIMIT)
    limit = ExposureLimit.objects.get(list_code="SITE")
    assert (limit.site, limit.value, limit.averaging_min, limit.sure) == (site, 0.02, 480, "site")
    assert "site standard 4" in page.get(url("agent", quartz.pk)).content.decode()


@pytest.mark.parametrize(("kind", "minutes"), [("TWA", 480), ("STEL", 15), ("C", 0)])
def test_a_limit_is_averaged_over_the_usual_time_unless_said_otherwise(page, quartz, kind, minutes):
    page.post(url("limit_add", quartz.pk), LIMIT | {"kind": kind})
    assert ExposureLimit.objects.get(list_code="SITE").averaging_min == minutes


@pytest.mark.parametrize(
    ("fields", "says"),
    [
        ({"value": "0"}, "above 0"),
        ({"value": "-1"}, "above 0"),
        ({"value": "nan"}, "Limit: nan is not allowed"),
        ({"value": "inf"}, "Limit: inf is not allowed"),
        ({"value": ""}, "required"),
        ({"unit": ""}, "required"),
        ({"unit": "ppm"}, "Unit: ppm is not allowed for Quartz"),
        ({"unit": "f/cm3"}, "which is not a fibre"),
        ({"fraction": "vapour"}, "is not a gas or vapour"),
        ({"source": ""}, "required"),
        ({"value": "50"}, "Did a unit slip by 1000?"),
        ({"value": "0.00005"}, "Did a unit slip by 1000?"),
    ],
    ids=str,
)
def test_bad_input_for_a_limit_is_refused_by_name(page, quartz, fields, says):
    answer = page.post(url("limit_add", quartz.pk), LIMIT | fields)
    assert says in refusals(answer)
    assert ExposureLimit.objects.count() == 1
    assert answer.context["form"]["value"].value() == (LIMIT | fields)["value"]


def test_an_own_limit_ends_with_a_reason_and_a_published_one_cannot(page, quartz, hygienist):
    page.post(url("limit_add", quartz.pk), LIMIT)
    own = ExposureLimit.objects.get(list_code="SITE")
    assert page.post(url("limit_withdraw", own.pk), {"reason": ""}).status_code == 422
    page.post(url("limit_withdraw", own.pk), {"reason": "standard was revised"})
    own.refresh_from_db()
    assert own.withdrawn_on is not None
    shipped = ExposureLimit.objects.get(site=None)
    assert page.get(url("limit_withdraw", shipped.pk)).status_code == 404
    with pytest.raises(ValueError, match="is a published one"):
        actions.withdraw_limit(shipped, on=DAY, by=hygienist, reason="long enough")


def test_three_people_at_agents_and_limits(page, quartz, site):
    coordinator = client_for(make_user("coordinator", site))
    stranger = client_for(make_user("hygienist", make_site("south")))
    own = make_limit(quartz, 0.01, site=site, list_code="SITE")
    pages = [url("agent_add"), url("limit_add", quartz.pk), url("limit_withdraw", own.pk)]
    assert [page.get(one).status_code for one in pages] == [200] * 3
    assert [coordinator.get(one).status_code for one in pages] == [403] * 3
    assert [stranger.get(one).status_code for one in pages] == [404] * 3
    assert coordinator.get(url("agents")).status_code == 200


def test_what_another_site_added_is_not_seen(page, site):
    south = make_site("south")
    theirs = make_agent("Southern dust", site=south)
    assert page.get(url("agent", theirs.pk)).status_code == 404
    assert page.post(url("limit_add", theirs.pk), LIMIT).status_code == 404
    assert found(page, "") == []
    shared = make_agent("Shared")
    make_limit(shared, 0.01, site=south, list_code="SITE", source="southern standard")
    assert "southern standard" not in page.get(url("agent", shared.pk)).content.decode()


def test_the_action_itself_asks_who_it_is(quartz, site):
    user = make_user("coordinator", site)
    for act in (
        lambda: actions.add_agent(Agent(key="NOCAS-X", name="X", source="s"), site=site, by=user),
        lambda: actions.add_limit(ExposureLimit(agent=quartz), site=site, by=user),
    ):
        with pytest.raises(PermissionDenied):
            act()


@pytest.mark.parametrize("bad", [float("nan"), float("inf"), 0.0, -0.1, 1e7])
def test_the_database_itself_refuses_a_limit_that_cannot_be(quartz, bad):
    with pytest.raises(IntegrityError), transaction.atomic():
        make_limit(quartz, bad)


def test_the_agents_page_tells_where_an_agent_is_met(page, quartz, site):
    make_task_agent(make_task(site, "Relining"), quartz)
    assert "Relining" in page.get(url("agent", quartz.pk)).content.decode()
    assert found(page, "?whose=used") == ["Quartz"]


def test_the_list_costs_the_same_queries_for_3_and_30_agents(page, django_assert_max_num_queries):
    counts = []
    for size in (3, 27):
        for number in range(size):
            make_limit(make_agent(f"Agent {size} {number}"))
        with django_assert_max_num_queries(30) as seen:
            page.get(url("agents"))
        counts.append(len(seen))
    assert counts[0] == counts[1]

"""The pages of samples: who may, what is refused, what is asked, and that nothing typed is lost."""

import re
from datetime import date, timedelta

import pytest
from django.urls import reverse

from exposure.models import Sample
from exposure.units import normalise
from tests.builders import (
    DAY,
    client_for,
    make_agent,
    make_sample,
    make_site,
    make_task,
    make_task_agent,
    make_user,
    make_worker,
)

pytestmark = pytest.mark.django_db


def url(name, *args):
    return reverse(f"exposure:{name}", args=["north", *args])


@pytest.fixture
def typed(group):
    """What a hygienist types for an ordinary sample."""
    return {
        "task_agent": group.pk,
        "sampled_on": str(DAY),
        "where": "personal",
        "span": "full",
        "minutes": "455",
        "result": "0.31",
        "unit": "mg/m3",
        "method": "gravimetric",
        "note": "windy",
        "reference": "L-17",
    }


def refusals(answer):
    assert answer.status_code == 422
    return " ".join(str(one) for errors in answer.context["form"].errors.values() for one in errors)


def test_a_sample_is_kept_as_reported_and_as_read(page, typed):
    page.post(url("sample_add"), typed | {"result": "310", "unit": "ug/m3"})
    sample = Sample.objects.get()
    assert (sample.result_as_reported, sample.unit_as_reported) == ("310", "ug/m3")
    assert (sample.value, sample.unit, sample.is_censored) == (0.31, "mg/m3", False)


@pytest.mark.parametrize(
    ("fields", "value", "reported"),
    [
        ({"result": "<0.02"}, 0.02, "<0.02"),
        ({"result": "< 20", "unit": "ug/m3"}, 0.02, "< 20"),
        ({"result": "ND", "lod": "0.02"}, 0.02, "ND"),
        ({"result": "n.d.", "lod": "20", "unit": "ug/m3"}, 0.02, "n.d."),
    ],
)
def test_below_detection_is_kept_as_such(page, typed, fields, value, reported):
    page.post(url("sample_add"), typed | fields)
    sample = Sample.objects.get()
    assert (sample.value, sample.lod, sample.is_censored) == (value, value, True)
    assert sample.result_as_reported == reported


@pytest.mark.parametrize(
    ("fields", "says"),
    [
        ({"unit": ""}, "Unit: none is chosen; it must be mg/m3, ug/m3, ppm, ppb or f/cm3"),
        ({"unit": "grains"}, "Unit: grains is not allowed"),
        ({"unit": "ppm"}, "Unit: ppm is not allowed for Quartz as particles; it must be mg/m3"),
        ({"unit": "f/cm3"}, "which is not a fibre"),
        ({"result": "0"}, "a measured zero is not possible; enter the detection limit as <value"),
        ({"result": "-0.2"}, "a result must be above 0"),
        ({"result": "nan"}, "is not a number that can be read"),
        ({"result": "inf"}, "is not a number that can be read"),
        ({"result": "1e999"}, "is too large"),
        ({"result": "1,5"}, "the decimal mark is a point: write 1.5"),
        ({"result": "1,234.5"}, "leave out the thousands separator"),
        ({"result": "0.3 mg/m3"}, "leave out the unit"),
        ({"result": "ND"}, "needs its detection limit"),
        ({"result": "<"}, "write < and the detection limit"),
        ({"result": "<0"}, "above 0"),
        ({"result": "0.01", "lod": "0.02"}, "is below its detection limit 0.02"),
        ({"result": ""}, "Result: empty"),
        ({"result": "5000000"}, "is beyond 1 000 000"),
        ({"minutes": "1441"}, "0.1 to 1440"),
        ({"minutes": "nan"}, "Minutes sampled: nan is not allowed"),
        ({"flow_l_min": "-2"}, "0.001 to 100"),
        ({"sampled_on": "2030-01-01"}, "lies in the future"),
        ({"sampled_on": "2020-01-01"}, "Relining is a task from 2024-01-08"),
        ({"sampled_on": "03/04/2026"}, "say which comes first, day or month"),
        ({"sampled_on": "2026-02-30"}, "2026-02-30 is not allowed"),
        ({"task_agent": "999999"}, "999999 is not an agent of any task here"),
        ({"task_agent": ""}, "Task and agent: none is chosen"),
        ({"task_agent": "7439-92-1"}, "is not an agent of any task here"),
        ({"worker": "999999"}, "is nobody on this roster"),
    ],
    ids=str,
)
def test_bad_input_is_refused_by_name_and_nothing_typed_is_lost(page, typed, fields, says):
    answer = page.post(url("sample_add"), typed | fields)
    assert says in refusals(answer)
    assert not Sample.objects.exists()
    html = answer.content.decode()
    assert 'value="gravimetric"' in html
    assert "windy" in html
    if fields.get("result"):
        assert answer.context["form"]["result"].value() == fields["result"]


@pytest.mark.parametrize(
    ("worker", "says"),
    [
        ({"active_from": DAY + timedelta(days=1)}, "is on the roster from 2026-03-03"),
        ({"active_to": DAY}, "is on the roster from 2024-01-08 to 2026-03-02"),
        (
            {"born_on": DAY + timedelta(days=1), "active_from": DAY + timedelta(days=2)},
            "Ana was not born yet",
        ),
    ],
    ids=["not yet here", "no longer here", "not yet born"],
)
def test_a_worker_must_have_been_there(page, typed, worker, site, says):
    one = make_worker(site, "Ana", **worker)
    assert says in refusals(page.post(url("sample_add"), typed | {"worker": one.pk}))


def test_a_task_that_was_over_takes_no_sample(page, typed, group):
    group.task.active_to = DAY
    group.task.save()
    assert "to 2026-03-02" in refusals(page.post(url("sample_add"), typed))


@pytest.mark.parametrize(
    ("fields", "says"),
    [
        ({"flow_l_min": "2.2", "volume_l": "900"}, "more than 5 % apart"),
        ({"span": "short", "minutes": "45"}, "long for a short-term sample"),
        ({"span": "full", "minutes": "120"}, "cover 25 % of the 8 h shift"),
        ({"result": "310"}, "Did a unit slip by 1000? That would make 0.31 mg/m³"),
        ({"result": "0.00031"}, "That would make 0.31 mg/m³"),
    ],
    ids=["volume", "short term", "part shift", "too high", "too low"],
)
def test_the_unlikely_is_asked_and_kept_after_a_tick(page, typed, group, fields, says):
    make_sample(group, 0.30)
    make_sample(group, 0.34)
    answer = page.post(url("sample_add"), typed | fields)
    assert says in refusals(answer)
    assert "Keep it as typed" in answer.content.decode()
    asked = answer.context["form"]["asked"].value()
    answer = page.post(url("sample_add"), typed | fields | {"is_meant": "on", "asked": asked})
    assert answer.status_code == 302
    assert Sample.objects.count() == 3


@pytest.mark.parametrize(
    ("fields", "offered"),
    [
        ({"result": "310"}, {"unit": "ug/m3"}),
        ({"unit": "ppm"}, {"unit": "mg/m3"}),
        ({"sampled_on": "2030-03-02"}, {"sampled_on": "2026-03-02"}),
    ],
    ids=["a unit too large", "a dust in ppm", "a year too late"],
)
def test_the_likeliest_meaning_is_offered_as_a_button(page, typed, group, fields, offered):
    make_sample(group, 0.30)
    html = page.post(url("sample_add"), typed | fields).content.decode()
    (name, value) = next(iter(offered.items()))
    assert re.search(f'<button[^>]*name="{name}" value="{value}"', html)
    page.post(url("sample_add"), typed | fields | {name: [(typed | fields)[name], value]})
    assert Sample.objects.count() == 2


def test_a_tick_does_not_answer_a_question_that_was_not_asked(page, typed, group):
    make_sample(group, 0.30)
    answer = page.post(url("sample_add"), typed | {"span": "full", "minutes": "120"})
    asked = answer.context["form"]["asked"].value()
    later = typed | {"result": "310", "minutes": "120", "is_meant": "on", "asked": asked}
    assert "slip by 1000" in refusals(page.post(url("sample_add"), later))


@pytest.mark.parametrize(
    ("volume", "status"), [("1001", 302), ("1051", 302), ("953.5", 302), ("1060", 422)]
)
def test_a_volume_within_five_percent_is_not_asked_about(page, typed, volume, status):
    fields = {"flow_l_min": "2.2", "minutes": "455", "volume_l": volume}
    assert page.post(url("sample_add"), typed | fields).status_code == status


def test_a_sample_inside_the_facepiece_is_kept_and_said_to_feed_nothing(page, typed):
    answer = page.post(url("sample_add"), typed | {"where": "inside"}, follow=True)
    assert Sample.objects.get().where == "inside"
    assert "never feeds the Air link" in answer.content.decode()
    assert "never feeds the Air link" in page.get(url("sample_add")).content.decode()


def test_the_same_sample_twice_is_refused(page, typed):
    page.post(url("sample_add"), typed)
    assert "already recorded" in refusals(page.post(url("sample_add"), typed | {"result": "0.310"}))


def test_a_gas_may_be_reported_in_ppb_and_is_shown_in_both_units(page, typed, site):
    toluene = make_agent("Toluene", kind="vapour", molar_mass_g_mol=92.14)
    row = make_task_agent(make_task(site), toluene, form="gas", fraction="vapour")
    fields = {"task_agent": row.pk, "result": "2500", "unit": "ppb"}
    html = page.post(url("sample_add"), typed | fields, follow=True).content.decode()
    assert Sample.objects.get().value == 2.5
    assert "In the air of the site" in html


@pytest.mark.parametrize(
    ("reported", "unit", "censored"),
    [("ND", "ug/m3", True), ("<20", "ug/m3", True), ("310", "µg/m³", False)],
)
def test_a_correction_begins_with_what_was_reported(page, group, reported, unit, censored):
    value = normalise(20 if censored else 310, unit)[0]
    old = make_sample(
        group,
        value,
        is_censored=censored,
        result_as_reported=reported,
        unit_as_reported=unit,
    )
    form = page.get(url("sample_replace", old.pk)).context["form"]
    answer = page.post(
        url("sample_replace", old.pk),
        {name: form[name].value() or "" for name in form.fields} | {"reason": "wrong person"},
    )
    new = Sample.objects.get(pk=Sample.objects.get(pk=old.pk).replaced_by_id)
    assert answer.status_code == 302
    assert (new.value, new.is_censored, new.unit_as_reported) == (value, censored, unit)


def test_a_correction_is_told_on_both_pages(page, typed, group):
    old = make_sample(group, 31.0)
    page.post(url("sample_replace", old.pk), typed | {"reason": "point was overlooked"})
    new = Sample.objects.get(value=0.31)
    before = page.get(url("sample", old.pk)).content.decode()
    assert "Replaced" in before
    assert f"record {new.pk}" in before
    assert "point was overlooked" in page.get(url("sample", new.pk)).content.decode()


def test_correcting_what_was_corrected_leads_to_the_newest(page, typed, group):
    old = make_sample(group, 31.0)
    page.post(url("sample_replace", old.pk), typed | {"reason": "point was overlooked"})
    answer = page.get(url("sample_replace", old.pk))
    assert answer.url == url("sample", Sample.objects.get(value=0.31).pk)


def test_a_short_reason_keeps_what_was_typed(page, typed, group):
    old = make_sample(group, 31.0)
    answer = page.post(url("sample_replace", old.pk), typed | {"reason": "x"})
    assert "Reason: 'x' is not enough" in refusals(answer)
    assert "windy" in answer.content.decode()


def test_withdrawing_takes_a_reason_and_leaves_the_list(page, group):
    old = make_sample(group, reference="L-9")
    assert page.post(url("sample_withdraw", old.pk), {"reason": ""}).status_code == 422
    page.post(url("sample_withdraw", old.pk), {"reason": "blank was contaminated"})
    assert "L-9" not in page.get(url("samples")).content.decode()
    assert "L-9" in page.get(url("samples") + "?state=withdrawn").content.decode()


def test_three_people_at_the_samples(group, page):
    sample, site = make_sample(group), group.task.site
    coordinator = client_for(make_user("coordinator", site))
    stranger = client_for(make_user("hygienist", make_site("south")))
    pages = [url("sample_add"), url("sample_replace", sample.pk), url("sample_withdraw", sample.pk)]
    assert [page.get(one).status_code for one in pages] == [200] * 3
    assert [coordinator.get(one).status_code for one in pages] == [403] * 3
    assert [stranger.get(one).status_code for one in pages] == [404] * 3
    seen = [url("samples"), url("sample", sample.pk)]
    assert [coordinator.get(one).status_code for one in seen] == [200] * 2
    assert [stranger.get(one).status_code for one in seen] == [404] * 2


def test_a_sample_of_another_site_is_not_found_and_not_listed(page):
    south = make_site("south")
    other = make_sample(make_task_agent(make_task(south)), reference="FAR-1")
    assert page.get(url("sample", other.pk)).status_code == 404
    assert page.post(url("sample_withdraw", other.pk), {"reason": "long enough"}).status_code == 404
    assert "FAR-1" not in page.get(url("samples")).content.decode()


def test_a_group_of_another_site_cannot_be_sampled(page, typed):
    other = make_task_agent(make_task(make_site("south")))
    assert "is not an agent of any task here" in refusals(
        page.post(url("sample_add"), typed | {"task_agent": other.pk})
    )


def listed(page, query):
    return [one.reference for one in page.get(url("samples") + query).context["page"].object_list]


def test_the_list_is_filtered_and_sorted(page, group, site):
    lead = make_task_agent(make_task(site, "Tapping"), make_agent("Lead", kind="fume"))
    make_sample(group, 0.3, date(2026, 1, 5), reference="A")
    make_sample(group, 0.02, date(2026, 1, 7), reference="B", is_censored=True)
    make_sample(lead, 0.1, date(2026, 2, 1), reference="C")
    assert listed(page, "") == ["C", "B", "A"]
    assert listed(page, "?sort=result") == ["B", "C", "A"]
    assert listed(page, f"?task={lead.task_id}") == ["C"]
    assert listed(page, f"?agent={group.agent_id}") == ["B", "A"]
    assert listed(page, "?below=yes") == ["B"]
    assert listed(page, "?from=2026-01-06&to=2026-01-31") == ["B"]
    assert listed(page, "?q=C") == ["C"]
    assert listed(page, "?sort=password&task=x&state=y&below=z&from=soon") == ["C", "B", "A"]


def test_the_export_holds_what_the_list_shows(page, group):
    make_sample(group, 0.02, reference="=A1", is_censored=True)
    lines = page.get(url("samples") + "?format=csv").content.decode().splitlines()
    assert lines[0].startswith("sample number,sampled on,task code")
    assert len(lines) == 2
    assert lines[1].startswith("'=A1,2026-03-02,")


def test_a_long_list_turns_pages(page, group):
    for number in range(101):
        make_sample(group, 0.1 + number / 1000)
    answer = page.get(url("samples"))
    assert len(answer.context["page"].object_list) == 100
    assert re.search(r"Page 1 of 2, 101 rows", answer.content.decode())


def test_an_empty_list_says_what_to_do(page, site):
    html = page.get(url("samples")).content.decode()
    assert "Add a task" in html
    make_task_agent(make_task(site))
    assert "Record the first sample" in page.get(url("samples")).content.decode()


def test_the_list_costs_the_same_queries_for_3_and_30_samples(
    page, group, django_assert_max_num_queries
):
    counts = []
    for size in (3, 27):
        for number in range(size):
            make_sample(group, 0.1, worker=make_worker(group.task.site), note=str(number))
        with django_assert_max_num_queries(30) as seen:
            page.get(url("samples"))
        counts.append(len(seen))
    assert counts[0] == counts[1]

"""The log of filter changes."""

from datetime import UTC, datetime, timedelta

import pytest
from django.core.exceptions import PermissionDenied
from django.db import IntegrityError, transaction
from django.urls import reverse
from django.utils import timezone

from programme.equipment import actions
from programme.equipment.models import FilterChange
from programme.ledger.models import Entry
from tests.builders import (
    client_for,
    make_assembly,
    make_crew,
    make_filter_change,
    make_site,
    make_task,
    make_user,
    make_worker,
)

pytestmark = pytest.mark.django_db
YESTERDAY = timezone.now() - timedelta(days=1)


def url(name, *args):
    return reverse(f"equipment:{name}", args=["north", *args])


def refusals(answer):
    assert answer.status_code == 422
    return " ".join(str(one) for errors in answer.context["form"].errors.values() for one in errors)


@pytest.fixture
def worn(site):
    """A worker on a crew, with the assembly worn there."""
    worker, assembly = make_worker(site, "Ana Whitlock"), make_assembly(site)
    make_crew(make_task(site), worker, assembly)
    return worker, assembly


@pytest.fixture
def typed(worn):
    worker, assembly = worn
    return {
        "worker": worker.pk,
        "assembly": assembly.pk,
        "fitted_at": f"{YESTERDAY:%Y-%m-%dT%H:%M}",
        "lot": "L-5",
    }


def test_a_change_is_stored_and_entered(page, typed, worn):
    answer = page.post(url("filter_change"), typed)
    change = FilterChange.objects.get()
    assert answer.url == worn[0].get_absolute_url()
    assert (change.lot, change.shifts_used) == ("L-5", None)
    assert Entry.objects.get().act == "filter changed"


def test_the_form_is_prefilled_from_the_worker(page, worn):
    form = page.get(url("filter_change") + f"?worker={worn[0].pk}").context["form"]
    assert form["worker"].value() == worn[0].pk
    assert form["assembly"].value() == worn[1].pk


def test_clock_time_is_that_of_the_site(worn, typed, site, page):
    site.time_zone = "America/Denver"
    site.save()
    page.post(url("filter_change"), typed | {"fitted_at": "2026-01-15T06:00"})
    assert FilterChange.objects.get().fitted_at == datetime(2026, 1, 15, 13, 0, tzinfo=UTC)


@pytest.mark.parametrize(
    ("fields", "says"),
    [
        ({"worker": ""}, "required"),
        ({"worker": "999999"}, "Select a valid choice"),
        ({"assembly": "999999"}, "Select a valid choice"),
        ({"fitted_at": ""}, "required"),
        ({"fitted_at": "this morning"}, "this morning is not a day and time; write it like"),
        ({"fitted_at": "2099-01-01T06:00"}, "lies in the future"),
        ({"fitted_at": "2026-03-02"}, "is not a day and time"),
        ({"fitted_at": "2026-02-30T06:00"}, "is not a day and time"),
        ({"fitted_at": "0001-01-01T00:00"}, "is not a day and time"),
        ({"fitted_at": "2020-01-01T06:00"}, "is on the roster from 2024-01-08"),
        ({"shifts_used": "-1"}, "0 to 2000"),
        ({"shifts_used": "nan"}, "0 to 2000"),
        ({"shifts_used": "40"}, "shifts lie between then and now"),
    ],
    ids=str,
)
def test_bad_input_is_refused_and_kept(page, typed, fields, says):
    answer = page.post(url("filter_change"), typed | fields)
    assert says in refusals(answer)
    assert 'value="L-5"' in answer.content.decode()
    assert not FilterChange.objects.exists()


def test_a_change_by_somebody_who_does_not_wear_it_is_asked_about(page, typed, site):
    fields = typed | {"worker": make_worker(site, "Tom Farrow").pk}
    assert "Tom Farrow is not on a crew" in refusals(page.post(url("filter_change"), fields))
    page.post(url("filter_change"), fields | {"is_meant": "on"})
    assert FilterChange.objects.count() == 1


def test_the_same_change_twice_is_refused(page, typed):
    page.post(url("filter_change"), typed)
    assert "is already in the log" in refusals(page.post(url("filter_change"), typed))


def test_there_is_nothing_to_change_where_air_is_supplied(site, worn, coordinator):
    worker, assembly = worn
    assembly.element = None
    assembly.save()
    change = FilterChange(worker=worker, assembly=assembly, fitted_at=YESTERDAY)
    with pytest.raises(ValueError, match="has no filter or cartridge to change"):
        actions.record_filter_change(change, by=coordinator)


def test_a_line_is_withdrawn_with_a_reason_and_leaves_the_log(page, worn):
    change = make_filter_change(*worn, lot="L-9")
    assert page.post(url("change_withdraw", change.pk), {"reason": "x"}).status_code == 422
    page.post(url("change_withdraw", change.pk), {"reason": "it was another worker"})
    assert "L-9" not in page.get(url("changes")).content.decode()
    html = page.get(url("changes") + "?state=all").content.decode()
    assert "it was another worker" in html
    assert Entry.objects.get().act == "filter change withdrawn"


def test_the_log_is_filtered_sorted_and_exported(page, worn, site):
    make_filter_change(*worn, datetime(2026, 1, 5, 6, tzinfo=UTC), lot="A")
    other = make_worker(site, "Tom Farrow")
    make_filter_change(other, worn[1], datetime(2026, 2, 5, 6, tzinfo=UTC), lot="B")

    def lots(query=""):
        return [one.lot for one in page.get(url("changes") + query).context["page"].object_list]

    assert lots() == ["B", "A"]
    assert lots("?sort=at") == ["A", "B"]
    assert lots(f"?worker={other.pk}") == ["B"]
    assert lots("?q=whitlock") == ["A"]
    assert lots("?assembly=999999") == []
    assert len(page.get(url("changes") + "?format=csv").content.decode().splitlines()) == 3


def test_an_empty_log_says_what_to_do(page, site):
    assert "Record the first change" in page.get(url("changes")).content.decode()
    assert "There is no assembly in use" in page.get(url("filter_change")).content.decode()


def test_three_people_at_the_log(page, worn, site):
    change = make_filter_change(*worn)
    manager = client_for(make_user("manager", site))
    stranger = client_for(make_user("coordinator", make_site("south")))
    pages = [url("filter_change"), url("change_withdraw", change.pk)]
    assert [page.get(one).status_code for one in pages] == [200] * 2
    assert [manager.get(one).status_code for one in pages] == [403] * 2
    assert [stranger.get(one).status_code for one in pages] == [404] * 2
    assert manager.get(url("changes")).status_code == 200
    with pytest.raises(PermissionDenied):
        actions.withdraw_filter_change(
            change, by=make_user("manager", site), reason="it was another worker"
        )


def test_a_change_of_another_site_is_not_found_and_not_listed(page):
    south = make_site("south")
    change = make_filter_change(make_worker(south), make_assembly(south), lot="FAR-1")
    assert page.get(url("change_withdraw", change.pk)).status_code == 404
    assert "FAR-1" not in page.get(url("changes")).content.decode()


@pytest.mark.parametrize("bad", [float("nan"), float("inf"), -1.0, 2001.0])
def test_the_database_itself_never_keeps_shifts_that_cannot_be(worn, bad):
    try:
        with transaction.atomic():
            kept = make_filter_change(*worn, shifts_used=bad)
    except IntegrityError:
        return
    kept.refresh_from_db()
    assert kept.shifts_used is None

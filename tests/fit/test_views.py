"""The pages of fit tests."""

from datetime import date, timedelta

import pytest
from django.urls import reverse

from programme.fit.models import FitTest
from programme.fit.outcome import slots_of
from programme.fit.validity import validity_of
from programme.rulepack.load import load
from tests.builders import (
    DAY,
    client_for,
    make_clearance,
    make_facepiece,
    make_fit_test,
    make_seal_note,
    make_site,
    make_user,
    make_worker,
    size_of,
)

pytestmark = pytest.mark.django_db


@pytest.fixture
def site():
    return make_site()


@pytest.fixture
def worker(site):
    return make_worker(site, name="Ana Whitlock", born_on=date(1990, 5, 1))


@pytest.fixture
def size(site):
    return size_of(make_facepiece(site, name="Tarn 40"))


@pytest.fixture
def hygienist(site):
    return client_for(make_user("hygienist", site))


def url(name, *args):
    return reverse(f"fit:{name}", args=["north", *args])


def entry_url(worker, size, protocol="ambient_aerosol_cnc", page="test_add"):
    return f"{url(page)}?worker={worker.pk}&size={size.pk}&protocol={protocol}"


def typed(figure="800", protocol="ambient_aerosol_cnc", **fields):
    slots = slots_of(load("us-2026-1").protocol(protocol))
    data = {slot.key: figure for slot in slots}
    return data | {"tested_on": str(DAY), "tester": "F. Tester"} | fields


def test_a_passed_test_is_stored_and_says_until_when(hygienist, worker, size):
    answer = hygienist.post(entry_url(worker, size), typed(), follow=True)
    text = answer.content.decode()
    assert FitTest.objects.get().outcome == "passed"
    assert "Passed, 800 against 100. Valid through 1 March 2027." in text


@pytest.mark.parametrize(
    ("who", "where", "status"),
    [("hygienist", "north", 200), ("coordinator", "north", 403), ("hygienist", "south", 404)],
    ids=["may", "may not", "of another site"],
)
@pytest.mark.parametrize("page", ["test_add", "test_correct", "test_withdraw"])
def test_who_reaches_the_pages_that_change_fit_tests(page, who, where, status, worker, size):
    args = [] if page == "test_add" else [make_fit_test(worker, size).pk]
    client = client_for(make_user(who, make_site(where)))
    assert client.get(url(page, *args)).status_code == status


@pytest.mark.parametrize(
    ("who", "where", "status"),
    [("hygienist", "north", 302), ("manager", "north", 403), ("hygienist", "south", 404)],
    ids=["may", "may not", "of another site"],
)
def test_who_may_store_a_fit_test(who, where, status, worker, size):
    client = client_for(make_user(who, make_site(where)))
    assert client.post(entry_url(worker, size), typed()).status_code == status
    assert FitTest.objects.count() == (status == 302)


@pytest.mark.parametrize(
    ("who", "where", "status"),
    [("manager", "north", 200), ("hygienist", "south", 404), (None, "north", 404)],
    ids=["sees", "of another site", "of no site"],
)
def test_who_sees_a_fit_test(who, where, status, worker, size):
    test = make_fit_test(worker, size)
    client = client_for(make_user(who, make_site(where)))
    assert client.get(url("test", test.pk)).status_code == status
    assert client.get(url("tests")).status_code == status


def test_a_worker_of_another_site_cannot_be_chosen(hygienist, size):
    stranger = make_worker(make_site("south"))
    answer = hygienist.get(entry_url(stranger, size))
    assert answer.status_code == 422
    assert stranger.name not in answer.content.decode()


def test_the_size_is_required(hygienist, worker):
    answer = hygienist.get(f"{url('test_add')}?worker={worker.pk}")
    assert answer.status_code == 422
    assert "Size: " in answer.content.decode()


def test_a_facepiece_that_needs_no_fit_test_cannot_be_chosen(hygienist, worker, site):
    hood = size_of(make_facepiece(site, kind="helmet_or_hood"))
    assert hygienist.get(entry_url(worker, hood)).status_code == 422


@pytest.mark.parametrize(
    ("kind", "protocol", "is_offered"),
    [
        ("half_mask", "modified_cnc_elastomeric", True),
        ("half_mask", "modified_cnc_ffr", False),
        ("filtering_facepiece", "modified_cnc_ffr", True),
        ("filtering_facepiece", "cnp_redon", False),
    ],
)
def test_only_protocols_for_that_facepiece_are_offered(
    hygienist, worker, site, kind, protocol, is_offered
):
    size = size_of(make_facepiece(site, kind=kind))
    text = hygienist.get(f"{url('test_add')}?worker={worker.pk}&size={size.pk}").content.decode()
    assert (f'value="{protocol}"' in text) == is_offered


def test_a_full_facepiece_in_great_britain_takes_no_qualitative_test():
    site = make_site("west", rule_pack="gb-2026-1")
    size = size_of(make_facepiece(site, kind="full_facepiece"))
    client = client_for(make_user("hygienist", site))
    address = reverse("fit:test_add", args=["west"])
    query = f"?worker={make_worker(site).pk}&size={size.pk}"
    text = client.get(address + query).content.decode()
    assert "taste_aerosol" not in text
    assert "2\u202f000" in text or "2000" in text
    assert "in every exercise" in text
    assert "unconfirmed" in text


@pytest.mark.parametrize(
    "figure",
    ["0", "-5", "0.5", "1e10", "1000000001", "nan", "inf", "good", "8OO", "1,234,567", "٣٠٠"],
)
def test_a_figure_that_is_no_fit_factor_is_named_and_kept(hygienist, worker, size, figure):
    answer = hygienist.post(entry_url(worker, size), typed(ff_5_1=figure))
    text = answer.content.decode()
    assert answer.status_code == 422
    assert "Talking: " in text
    assert f'value="{figure}"' in text
    assert not FitTest.objects.exists()


@pytest.mark.parametrize(
    ("day", "says"),
    [
        ("2099-01-01", "lies in the future"),
        ("1990-05-01", "was born on 1990-05-01"),
        ("2020-01-01", "before Ana Whitlock&#x27;s first day here"),
        ("", "required"),
        ("tomorrow", "tomorrow is not allowed"),
        ("2026-02-30", "2026-02-30 is not allowed"),
    ],
)
def test_a_day_that_cannot_be_is_asked_about(hygienist, worker, size, day, says):
    answer = hygienist.post(entry_url(worker, size), typed(tested_on=day))
    assert answer.status_code == 422
    assert says in answer.content.decode()
    assert not FitTest.objects.exists()


def test_a_future_day_offers_the_likeliest_one_as_a_button(hygienist, worker, size):
    text = hygienist.post(entry_url(worker, size), typed(tested_on="2099-02-03")).content.decode()
    assert '-02-03">Use ' in text
    data = typed() | {"tested_on": ["2099-02-03", str(DAY)]}
    hygienist.post(entry_url(worker, size), data)
    assert FitTest.objects.get().tested_on == DAY


def test_a_test_brought_from_elsewhere_is_taken_after_a_tick(hygienist, worker, size):
    data = typed(tested_on="2023-12-01", is_meant="on")
    assert hygienist.post(entry_url(worker, size), data).status_code == 302


def test_a_missing_figure_makes_the_test_incomplete_and_never_passed(hygienist, worker, size):
    hygienist.post(entry_url(worker, size), typed(ff_3_1=""))
    assert FitTest.objects.get().outcome == "incomplete"


def test_a_test_without_any_figure_is_asked_about(hygienist, worker, size):
    answer = hygienist.post(entry_url(worker, size), typed(figure=""))
    assert "Store the test as incomplete?" in answer.content.decode()
    assert not FitTest.objects.exists()


def test_a_test_of_somebody_who_left_can_still_be_entered_and_corrected(hygienist, site, size):
    left = make_worker(site, active_to=DAY + timedelta(days=30))
    assert hygienist.post(entry_url(left, size), typed()).status_code == 302
    data = typed("700", reason="figures of the next sheet were typed")
    address = url("test_correct", FitTest.objects.get().pk)
    assert hygienist.post(address, data).status_code == 302


def test_a_failure_is_kept_and_offers_another_size(hygienist, worker, size):
    text = hygienist.post(entry_url(worker, size), typed("60"), follow=True).content.decode()
    assert FitTest.objects.get().outcome == "failed"
    assert "try another size" in text


def test_a_reported_overall_that_disagrees_asks_why_and_the_exercises_govern(
    hygienist, worker, size
):
    data = typed("100", ff_1_1="1000", as_reported="228.6")
    answer = hygienist.post(entry_url(worker, size), data)
    text = answer.content.decode()
    assert answer.status_code == 422
    assert "reported 228" in text
    assert "worked out 114" in text
    hygienist.post(entry_url(worker, size), data | {"note": "paper shows a plain average"})
    test = FitTest.objects.get()
    assert test.overall_fit_factor == pytest.approx(7 / (6 / 100 + 1 / 1000))
    assert test.as_reported == "228.6"


def test_the_same_test_twice_is_refused_with_the_first_shown(hygienist, worker, size):
    hygienist.post(entry_url(worker, size), typed())
    text = hygienist.post(entry_url(worker, size), typed()).content.decode()
    assert "on file already" in text
    assert FitTest.objects.count() == 1


def test_another_test_on_the_same_day_is_asked_about(hygienist, worker, size):
    hygienist.post(entry_url(worker, size), typed("60"))
    again = hygienist.post(entry_url(worker, size), typed("900"))
    assert "Is this a repeat?" in again.content.decode()
    hygienist.post(entry_url(worker, size), typed("900", is_meant="on"))
    assert FitTest.objects.count() == 2


def test_working_out_stores_nothing(hygienist, worker, size):
    answer = hygienist.post(entry_url(worker, size), typed(work_out="Work out"))
    assert answer.status_code == 200
    assert "Passed, 800 against 100." in answer.content.decode()
    assert not FitTest.objects.exists()


@pytest.mark.parametrize(
    ("data", "says"),
    [
        (typed("600"), "Passed, 600 against 100."),
        (typed("600", ff_8_1=""), "Incomplete: no figure for"),
        (typed("600", ff_2_1="x"), "x is not allowed"),
        (typed("60"), "Failed, 60 against 100."),
    ],
)
def test_the_preview_says_what_the_figures_come_to(hygienist, worker, size, data, says):
    answer = hygienist.post(entry_url(worker, size, page="preview"), data)
    assert says in answer.content.decode()
    assert not FitTest.objects.exists()


def test_a_qualitative_test_has_a_tick_and_no_figures(hygienist, worker, size):
    address = entry_url(worker, size, "saccharin")
    assert "ff_1_1" not in hygienist.get(address).content.decode()
    data = {"tested_on": str(DAY), "tester": "F. Tester", "is_passed": "yes"}
    hygienist.post(address, data)
    assert FitTest.objects.get().outcome == "passed"


def test_what_stands_in_the_way_is_said_before_the_first_figure(hygienist, worker, size):
    make_seal_note(worker, "facial_hair")
    text = hygienist.get(entry_url(worker, size)).content.decode()
    assert "has no clearance" in text
    assert "Facial hair across the seal was noted on 2026-03-02" in text
    make_clearance(worker)
    make_seal_note(worker, "clean_shaven", on=DAY + timedelta(days=1))
    assert "What stands in the way" not in hygienist.get(entry_url(worker, size)).content.decode()


def test_a_correction_keeps_the_old_test_in_words(hygienist, worker, size):
    hygienist.post(entry_url(worker, size), typed("600"))
    old = FitTest.objects.get()
    data = typed("700", reason="figures of the next sheet were typed")
    hygienist.post(url("test_correct", old.pk), data)
    old.refresh_from_db()
    assert old.replaced_by.overall_fit_factor == pytest.approx(700)
    text = hygienist.get(url("test", old.pk)).content.decode()
    assert "Replaced" in text
    assert "figures of the next sheet were typed" in text


def test_a_correction_starts_from_what_is_on_file(hygienist, worker, size):
    hygienist.post(entry_url(worker, size), typed("617"))
    text = hygienist.get(url("test_correct", FitTest.objects.get().pk)).content.decode()
    assert text.count('value="617"') == 8


def test_correcting_a_replaced_test_leads_to_the_newest(hygienist, worker, size):
    new = make_fit_test(worker, size)
    old = make_fit_test(worker, size, replaced_by=new)
    answer = hygienist.get(url("test_correct", old.pk))
    assert answer.url == new.get_absolute_url()


@pytest.mark.parametrize(
    ("on", "state"),
    [
        (date(2026, 3, 1), "not yet"),
        (date(2026, 3, 2), "valid"),
        (date(2027, 1, 30), "valid"),
        (date(2027, 1, 31), "due soon"),
        (date(2027, 3, 1), "due soon"),
        (date(2027, 3, 2), "lapsed"),
    ],
)
def test_a_fit_test_no_longer_counts_on_its_expiry_day(worker, size, on, state):
    test = make_fit_test(worker, size, date(2026, 3, 2))
    assert validity_of(test, pack=load("us-2026-1"), on=on).state == state


@pytest.mark.parametrize(
    ("query", "found"),
    [
        ("", {"Ana", "Bo", "Cy"}),
        ("q=ana", {"Ana"}),
        ("q=Tarn", {"Ana", "Bo", "Cy"}),
        ("outcome=failed", {"Bo"}),
        ("due=lapsed", {"Cy"}),
        ("due=valid", {"Ana"}),
        ("due=soon", set()),
        ("due=nonsense&outcome=nonsense&sort=nonsense&page=x&facepiece=x", {"Ana", "Bo", "Cy"}),
    ],
)
def test_the_list_shows_what_the_filters_let_through(hygienist, site, size, query, found):
    make_fit_test(make_worker(site, "Ana"), size, date(2026, 2, 1))
    make_fit_test(make_worker(site, "Bo"), size, date(2026, 2, 1), outcome="failed")
    make_fit_test(make_worker(site, "Cy"), size, date(2024, 2, 1))
    answer = hygienist.get(f"{url('tests')}?on=2026-03-02&{query}")
    assert {test.worker.name for test, _ in answer.context["lines"]} == found


def test_an_old_test_is_not_called_lapsed_once_a_newer_one_passed(hygienist, site, size):
    worker = make_worker(site, "Ana")
    make_fit_test(worker, size, date(2024, 2, 1))
    make_fit_test(worker, size, date(2026, 2, 1))
    answer = hygienist.get(f"{url('tests')}?on=2026-03-02&due=lapsed")
    assert answer.context["lines"] == []


def test_the_list_goes_out_as_csv_with_the_unrounded_figure(hygienist, worker, size):
    make_fit_test(worker, size, fit_factors=(100.0, 300.0))
    lines = hygienist.get(f"{url('tests')}?format=csv").content.decode().splitlines()
    assert lines[1].startswith(f"{worker.personnel_number},Ana Whitlock,Tarn 40,M,2026-03-02,")
    assert ",150.0," in lines[1]


def test_the_list_costs_the_same_queries_for_3_and_30_tests(
    hygienist, site, size, django_assert_max_num_queries
):
    for _ in range(30):
        make_fit_test(make_worker(site), size)
    with django_assert_max_num_queries(20):
        hygienist.get(url("tests"))


def test_an_empty_list_says_what_to_do(hygienist):
    assert "Record the first one" in hygienist.get(url("tests")).content.decode()

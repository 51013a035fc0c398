"""The pages of respirators: added, changed, withdrawn, and who may."""

import pytest
from django.core.exceptions import PermissionDenied
from django.db import IntegrityError, transaction
from django.urls import reverse

from programme.equipment import actions
from programme.equipment.models import Assembly, Element, Facepiece
from programme.ledger.models import Entry
from tests.builders import (
    DAY,
    client_for,
    make_assembly,
    make_crew,
    make_element,
    make_facepiece,
    make_filter_change,
    make_fit_test,
    make_site,
    make_task,
    make_user,
    make_worker,
    size_of,
)

pytestmark = pytest.mark.django_db
FACEPIECE = {"name": "Alder 2", "kind": "half_mask", "sizes": "S, M, L"}
ELEMENT = {"name": "Filter A", "particulate_class": "P100", "in_stock": "40"}


def url(name, *args):
    return reverse(f"equipment:{name}", args=["north", *args])


def refusals(answer):
    assert answer.status_code == 422
    return " ".join(str(one) for errors in answer.context["form"].errors.values() for one in errors)


@pytest.fixture
def typed(site):
    """What is typed for an ordinary assembly."""
    return {
        "name": "Alder 2 with Filter A",
        "facepiece": make_facepiece(site, name="Alder 2").pk,
        "respirator_class": "apr_half",
        "element": make_element(site, name="Filter A").pk,
        "approval_number": "TC-84A-0000",
        "in_stock": "10",
    }


def test_a_facepiece_is_added_with_its_sizes_in_order(page):
    page.post(url("facepiece_add"), FACEPIECE)
    assert [size.label for size in Facepiece.objects.get().sizes.all()] == ["S", "M", "L"]
    assert [one.act for one in Entry.objects.all()] == ["facepiece added", "facepiece sizes set"]


@pytest.mark.parametrize(
    ("fields", "says"),
    [
        ({"sizes": ""}, "required"),
        ({"sizes": " , ,"}, "Sizes: none"),
        ({"sizes": "M, M"}, "M stands twice"),
        ({"sizes": "M" * 21}, "at most 20 characters"),
        ({"name": "Alder 1"}, "Alder 1 is already recorded here"),
        ({"kind": "scarf"}, "scarf"),
    ],
    ids=str,
)
def test_bad_input_for_a_facepiece_is_refused_and_kept(page, site, fields, says):
    make_facepiece(site, name="Alder 1")
    answer = page.post(url("facepiece_add"), FACEPIECE | fields)
    assert says in refusals(answer)
    assert answer.context["form"]["name"].value() == (FACEPIECE | fields)["name"]
    assert Facepiece.objects.count() == 1


def test_a_size_in_use_stays_one_not_used_may_go(page, site):
    facepiece = make_facepiece(site, name="Alder 2")
    make_fit_test(make_worker(site), size_of(facepiece, "M"))
    change = url("facepiece_change", facepiece.pk)
    assert "M is not allowed to go" in refusals(page.post(change, FACEPIECE | {"sizes": "S, L"}))
    assert page.post(change, FACEPIECE | {"sizes": "M, L, XL"}).status_code == 302
    assert [size.label for size in facepiece.sizes.all()] == ["M", "L", "XL"]


def test_the_kind_of_a_facepiece_in_an_assembly_stays(page, site):
    facepiece = make_facepiece(site, name="Alder 2")
    make_assembly(site, facepiece)
    answer = page.post(
        url("facepiece_change", facepiece.pk), FACEPIECE | {"kind": "full_facepiece"}
    )
    assert "full facepiece is not allowed; assemblies are made of it" in refusals(answer)


@pytest.mark.parametrize(
    ("fields", "says"),
    [
        ({"particulate_class": ""}, "none, and no gas type; it must be one or both"),
        ({"particulate_class": "P3"}, "P3"),
        ({"gas_elements": ["MAGIC"]}, "MAGIC"),
        ({"gas_class": "2"}, "2"),
        ({"area_cm2": "nan"}, "5 to 20000"),
        ({"area_cm2": "0"}, "5 to 20000"),
        ({"clean_resistance_pa": "-3"}, "1 to 1000"),
        ({"maker_max_h": "inf"}, "0.1 to 5000"),
        ({"in_stock": "-1"}, "0 to 1000000"),
        ({"in_stock": "2.5"}, "a whole number"),
        ({"cartridge_life_h": "8"}, "has no gas type"),
        ({"cartridge_life_h": "8", "gas_elements": ["OV"]}, "name the maker's data, test or model"),
        ({"name": ""}, "required"),
    ],
    ids=str,
)
def test_bad_input_for_a_filter_is_refused(page, site, fields, says):
    answer = page.post(url("element_add"), ELEMENT | fields)
    assert says in refusals(answer)
    assert not Element.objects.exists()


def test_a_cartridge_is_added_with_where_its_life_comes_from(page):
    more = {
        "gas_elements": ["OV"],
        "cartridge_life_h": "6.5",
        "cartridge_life_source": "maker's table 3",
    }
    page.post(url("element_add"), ELEMENT | more)
    element = Element.objects.get()
    assert (element.gas_elements, element.cartridge_life_h) == (["OV"], 6.5)


def test_a_gas_filter_of_a_classed_type_keeps_its_capacity_class(db):
    site = make_site("dale", rule_pack="gb-2026-1")
    page = client_for(make_user("coordinator", site))
    add = reverse("equipment:element_add", args=["dale"])
    page.post(
        add,
        {"name": "A2P3", "particulate_class": "P3", "gas_elements": ["A"], "gas_class": "2"}
        | {"in_stock": "1"},
    )
    assert Element.objects.get().gas_class == 2
    answer = page.post(add, {"name": "P3", "particulate_class": "P3", "gas_class": "2"})
    assert "Capacity class: only for A, B, E, K" in refusals(answer)


def test_a_changed_filter_must_still_belong_to_its_assemblies(db):
    site = make_site("dale", rule_pack="gb-2026-1")
    element = make_element(site, name="Filter C", particulate_class="P3")
    make_assembly(site, element=element, respirator_class="half_p3", name="Half P3")
    page = client_for(make_user("coordinator", site))
    change = reverse("equipment:element_change", args=["dale", element.pk])
    answer = page.post(change, {"name": "Filter C", "particulate_class": "P2", "in_stock": "1"})
    assert "Half P3 would no longer belong together" in refusals(answer)
    element.refresh_from_db()
    assert element.particulate_class == "P3"


def test_an_assembly_is_added_and_shows_its_factor_and_clause(page, typed):
    html = page.post(url("assembly_add"), typed, follow=True).content.decode()
    assert Assembly.objects.get().respirator_class == "apr_half"
    assert "assigned protection factor 10" in html
    assert "29 CFR 1910.134(d)(3)(i)(A)" in html
    assert "a typical figure is assumed" in html


@pytest.mark.parametrize(
    ("fields", "says"),
    [
        ({"respirator_class": "apr_full"}, "is not allowed for Alder 2, a half mask; it may be"),
        ({"respirator_class": "half_p3"}, "half_p3"),
        ({"element": ""}, "cleans the air and needs one"),
        ({"element": "999999"}, "Select a valid choice"),
        ({"facepiece": ""}, "required"),
        ({"maker_evidence": "study"}, "has no higher factor to show"),
        ({"service_life_min": "30"}, "carries no air of its own"),
        ({"service_life_min": "nan"}, "1 to 1440"),
        ({"in_stock": "many"}, "0 to 1000000"),
    ],
    ids=str,
)
def test_bad_input_for_an_assembly_is_refused_and_kept(page, typed, fields, says):
    answer = page.post(url("assembly_add"), typed | fields)
    assert says in refusals(answer)
    assert 'value="TC-84A-0000"' in answer.content.decode()
    assert not Assembly.objects.exists()


def test_parts_of_another_site_cannot_be_joined(page, typed, coordinator, site):
    theirs = make_facepiece(make_site("south"))
    answer = page.post(url("assembly_add"), typed | {"facepiece": theirs.pk})
    assert "Select a valid choice" in refusals(answer)
    assembly = Assembly(
        site=site, name="x", facepiece=theirs, respirator_class="apr_half", element=None
    )
    with pytest.raises(ValueError, match="a part is not of North works"):
        actions.save_assembly(assembly, by=coordinator)


def test_a_change_of_an_assembly_keeps_what_stood_before(page, typed):
    page.post(url("assembly_add"), typed)
    assembly = Assembly.objects.get()
    page.post(url("assembly_change", assembly.pk), typed | {"in_stock": "3"})
    assert Entry.objects.get(act="assembly changed").detail == {"in_stock": ["10", "3"]}


def test_withdrawing_a_facepiece_takes_every_assembly_made_of_it(page, site):
    facepiece = make_facepiece(site)
    gone = make_assembly(site, facepiece, name="Gone")
    stays = make_assembly(site, name="Stays")
    make_crew(make_task(site), make_worker(site), gone)
    page_of = url("facepiece_withdraw", facepiece.pk)
    assert "Gone</a>, worn by 1 today" in page.get(page_of).content.decode()
    assert page.post(page_of, {"reason": ""}).status_code == 422
    page.post(page_of, {"reason": "recalled by its maker"})
    gone.refresh_from_db()
    stays.refresh_from_db()
    assert gone.withdrawn_on is not None
    assert stays.withdrawn_on is None
    assert Entry.objects.filter(reason__contains="recalled by its maker").count() == 2
    assert "Withdrawn" in page.get(url("assembly", gone.pk)).content.decode()


def test_what_was_withdrawn_is_not_withdrawn_twice(coordinator, site):
    element = make_element(site)
    actions.withdraw(element, on=DAY, by=coordinator, reason="damp in the store")
    with pytest.raises(ValueError, match="was withdrawn before"):
        actions.withdraw(element, on=DAY, by=coordinator, reason="damp in the store")


def test_a_withdrawn_facepiece_is_not_offered_for_a_new_assembly(page, typed):
    Facepiece.objects.update(withdrawn_on=DAY)
    assert "Select a valid choice" in refusals(page.post(url("assembly_add"), typed))


def test_an_assembly_under_another_pack_answers_nothing_and_says_so(page, site):
    assembly = make_assembly(site, respirator_class="half_p3")
    html = page.get(url("assembly", assembly.pk)).content.decode()
    assert "The class half_p3 is not in United States respirator rules" in html


def test_the_page_of_an_assembly_tells_who_wears_it_and_the_last_changes(page, site):
    assembly, worker = make_assembly(site), make_worker(site, "Ana Whitlock")
    make_crew(make_task(site, "Relining"), worker, assembly)
    make_filter_change(worker, assembly, lot="L-5")
    html = page.get(url("assembly", assembly.pk)).content.decode()
    assert "Ana Whitlock" in html
    assert "Relining" in html
    assert "lot L-5" in html


def names(page, query=""):
    rows = page.get(url("respirators") + query).context["page"].object_list
    return [one.assembly.name for one in rows]


def test_the_list_is_filtered_and_sorted(page, site):
    full = make_facepiece(site, kind="full_facepiece", name="Birch")
    make_assembly(site, full, name="B", respirator_class="apr_full", in_stock=1)
    make_assembly(site, name="A", in_stock=5)
    make_assembly(site, name="C", withdrawn_on=DAY)
    assert names(page) == ["A", "B"]
    assert names(page, "?sort=-apf") == ["B", "A"]
    assert names(page, "?sort=stock") == ["B", "A"]
    assert names(page, "?kind=full_facepiece") == ["B"]
    assert names(page, "?q=birch") == ["B"]
    assert names(page, "?state=withdrawn") == ["C"]
    assert names(page, "?sort=secret&kind=x&state=y") == ["A", "B"]


@pytest.mark.parametrize("kind", ["assemblies", "facepieces", "elements", "nonsense"])
def test_each_list_is_exported(page, site, kind):
    make_assembly(site)
    answer = page.get(url("respirators") + f"?format=csv&list={kind}")
    assert answer["Content-Type"].startswith("text/csv")
    assert len(answer.content.decode().splitlines()) == 2


def test_an_empty_shelf_says_what_to_do(page, site):
    assert "Add a facepiece</a> first" in page.get(url("respirators")).content.decode()
    assert "There is no facepiece in use" in page.get(url("assembly_add")).content.decode()


@pytest.mark.parametrize("pack", ["us-2026-1", "gb-2026-1"])
def test_the_classes_page_prints_the_whole_table_of_the_pack(db, pack):
    site = make_site("dale", rule_pack=pack)
    page = client_for(make_user("manager", site))
    answer = page.get(reverse("equipment:classes", args=["dale"]))
    rows = answer.context["rows"]
    assert [row.apf for row in rows] == sorted(row.apf for row in rows)
    html = answer.content.decode()
    assert all(row.name in html for row in rows)
    assert ('"Mark">unconfirmed' in html) == any(row.is_unconfirmed for row in rows)


def test_the_classes_are_filtered_and_exported(page):
    html = page.get(url("classes") + "?family=scba&kind=full_facepiece").content.decode()
    assert "pressure-demand self-contained" in html
    assert "air-purifying" not in html.split("<tbody>")[1]
    lines = page.get(url("classes") + "?format=csv").content.decode().splitlines()
    assert len(lines) == 23


def test_three_people_at_the_respirators(page, site):
    assembly = make_assembly(site)
    manager = client_for(make_user("manager", site))
    stranger = client_for(make_user("coordinator", make_site("south")))
    pages = [
        url("assembly_add"),
        url("facepiece_add"),
        url("element_add"),
        url("assembly_change", assembly.pk),
        url("facepiece_change", assembly.facepiece_id),
        url("element_change", assembly.element_id),
        url("assembly_withdraw", assembly.pk),
    ]
    assert [page.get(one).status_code for one in pages] == [200] * 7
    assert [manager.get(one).status_code for one in pages] == [403] * 7
    assert [stranger.get(one).status_code for one in pages] == [404] * 7
    seen = [url("respirators"), url("assembly", assembly.pk), url("classes")]
    assert [manager.get(one).status_code for one in seen] == [200] * 3
    assert [stranger.get(one).status_code for one in seen] == [404] * 3


def test_another_sites_parts_are_not_found(page):
    theirs = make_assembly(make_site("south"))
    pages = [
        url("assembly", theirs.pk),
        url("assembly_change", theirs.pk),
        url("facepiece_change", theirs.facepiece_id),
        url("element_withdraw", theirs.element_id),
    ]
    assert [page.get(one).status_code for one in pages] == [404] * 4


def test_the_action_itself_asks_who_it_is(site):
    manager, element = make_user("manager", site), make_element(site)
    for act in (
        lambda: actions.save_element(element, by=manager),
        lambda: actions.save_facepiece(make_facepiece(site), sizes=["M"], by=manager),
        lambda: actions.save_assembly(make_assembly(site), by=manager),
        lambda: actions.withdraw(element, on=DAY, by=manager, reason="damp in the store"),
    ):
        with pytest.raises(PermissionDenied):
            act()


@pytest.mark.parametrize("bad", [float("nan"), float("inf"), -1.0, 1e9])
@pytest.mark.parametrize(
    "field", ["area_cm2", "clean_resistance_pa", "maker_max_h", "cartridge_life_h"]
)
def test_the_database_itself_never_keeps_a_figure_that_cannot_be(site, field, bad):
    # SQLite binds NaN as NULL: what is kept then is "not recorded".
    try:
        with transaction.atomic():
            kept = make_element(site, **{field: bad})
    except IntegrityError:
        return
    kept.refresh_from_db()
    assert getattr(kept, field) is None


def test_the_list_costs_the_same_queries_for_3_and_30_assemblies(
    page, site, django_assert_max_num_queries
):
    counts = []
    for size in (3, 27):
        for _ in range(size):
            make_assembly(site)
        with django_assert_max_num_queries(30) as seen:
            page.get(url("respirators"))
        counts.append(len(seen))
    assert counts[0] == counts[1]

"""What an unknown, a stray unit or a clever combination may not get past the chain."""

import math
from datetime import UTC, date, datetime, timedelta

import pytest

from exposure.models import Sample, Task
from programme.fit.models import FitTest
from programme.selection.assess import assess
from programme.selection.links.filter import days_of
from tests import builders as b
from tests.selection.scene import codes, judged, whole

pytestmark = pytest.mark.django_db


def set_agent(scene, **fields):
    for name, value in fields.items():
        setattr(scene.agent, name, value)
    scene.agent.save()


def vapour(unit="ppm", **agent_fields):
    """A vapour at some 0.05 ppm, limit 1 ppm, organic-vapour cartridges with objective data."""
    scene = whole()
    fields = {"kind": "vapour", "us_filter_need": "OV", "boiling_point_c": 110.0}
    set_agent(scene, **{**fields, "molar_mass_g_mol": 100.0, **agent_fields})
    scene.task_agent.form, scene.task_agent.fraction = "gas", "vapour"
    scene.task_agent.save()
    scene.limit.fraction, scene.limit.unit, scene.limit.value = "vapour", "ppm", 1.0
    scene.limit.save()
    Sample.objects.update(unit=unit)
    scene.element.gas_elements = ["OV"]
    scene.element.cartridge_life_h, scene.element.cartridge_life_source = 9, "invented test"
    scene.element.save()
    return scene


def short(scene, *values):
    for value in values:
        b.make_sample(scene.task_agent, value, span="short", unit="ppm")


SHORT = (10.0, 12.0, 9.0, 11.0, 10.5, 9.5)


def test_the_vapour_scene_has_nothing_against_it():
    assert codes(vapour()) == set()


# Air and limit


def test_a_sample_no_longer_counts_on_the_day_its_age_runs_out():
    scene = whole()
    Sample.objects.update(sampled_on=date(2023, 3, 3))
    assert "exposure-unknown" not in codes(scene, date(2026, 3, 2))
    Sample.objects.update(sampled_on=date(2023, 3, 2))
    assert "exposure-unknown" in codes(scene, date(2026, 3, 2))


def test_results_in_a_unit_that_cannot_be_compared_are_not_dropped_in_silence():
    scene = whole()
    b.make_sample(scene.task_agent, 5.0, on=b.DAY - timedelta(days=1), unit="f/cm3")
    assert "sample-unit" in codes(scene)


def test_an_area_sample_does_not_choose_the_unit():
    scene = whole()
    b.make_sample(scene.task_agent, 5.0, unit="f/cm3", where="area")
    assert codes(scene) == set()


def test_without_a_limit_area_samples_are_still_no_assessment():
    scene = whole()
    scene.limit.delete()
    assert judged(scene).first_break.name == "Limit"
    Sample.objects.update(where="area")
    assert judged(scene).first_break.name == "Air"


def test_a_stricter_limit_in_another_unit_is_not_passed_over():
    scene = vapour(molar_mass_g_mol=None)
    b.make_limit(scene.agent, 0.001, list_code="SITE", fraction="vapour", site=scene.site)
    assert "limit-unit" in codes(scene)


def test_a_limit_printed_in_both_units_needs_no_molar_mass():
    scene = vapour(molar_mass_g_mol=None)
    b.make_limit(scene.agent, 4.0, fraction="vapour")
    assert "limit-unit" not in codes(scene)


def test_a_total_limit_of_the_site_does_not_replace_the_finer_one_of_the_law():
    scene = whole()
    scene.task_agent.fraction = "total"
    scene.task_agent.save()
    b.make_limit(scene.agent, 0.5, list_code="SITE", fraction="total", site=scene.site)
    assert judged(scene).links[1].workings[0].figures["limit"] == 0.05


@pytest.mark.parametrize(
    ("note", "drives"),
    [("maximum peak above the ceiling, 10 min", False), ("speak to the hygienist", True)],
    ids=["allowance above a ceiling", "any other note"],
)
def test_only_a_maximum_peak_is_no_limit_of_its_own(note, drives):
    scene = vapour()
    b.make_limit(scene.agent, 2.0, kind="C", fraction="vapour", unit="ppm", note=note)
    assert ("peak-unsampled" in codes(scene)) is drives


def test_a_shift_average_without_an_estimate_does_not_hide_behind_a_short_term_one():
    scene = vapour()
    b.make_limit(scene.agent, 20.0, kind="STEL", fraction="vapour", unit="ppm")
    short(scene, *SHORT)
    assert math.isfinite(judged(scene).links[2].workings[0].figures["ratio"])
    Sample.objects.filter(span="full").delete()
    chain = judged(scene)
    assert chain.links[2].figure == "not known"
    assert not any(one.answers for one in chain.choices)


# Ratio


def test_a_short_peak_reaches_the_idlh_figure_though_the_average_has_the_larger_ratio():
    scene = vapour(idlh_value=15.0, idlh_unit="ppm")
    scene.limit.value = 0.05
    scene.limit.save()
    b.make_limit(scene.agent, 20.0, kind="STEL", fraction="vapour", unit="ppm")
    short(scene, *(2 * value for value in SHORT))
    assert "idlh-class" in codes(scene)


def test_an_idlh_figure_in_another_unit_is_said_not_to_be_compared():
    scene = whole()
    set_agent(scene, idlh_value=5.0, idlh_unit="ppm")
    assert "idlh-unit" in codes(scene)


def test_a_shift_average_above_a_stricter_ceiling_needs_no_short_sample_to_break():
    scene = vapour()
    b.make_limit(scene.agent, 0.01, kind="C", fraction="vapour", unit="ppm")
    found = [m for m in judged(scene).mismatches if m.code == "peak-unsampled"]
    assert [one.severity for one in found] == ["stop"]


@pytest.mark.parametrize(
    ("altitude_m", "percent", "is_idlh"),
    [
        (0, 16.0, False),
        (0, 15.9, True),
        (914.4, 16.0, False),
        (1000, 16.0, True),
        (1000, 16.4, False),
        (2500, 19.4, True),
    ],
)
def test_low_oxygen_inside_its_altitude_band_lets_any_supplied_air_do(altitude_m, percent, is_idlh):
    """29 CFR 1910.134(d)(2)(iii) Table II (verified): 16.0 % to 3000 ft, 16.4 % to 4000 ft,
    none above 8000 ft; a filter never does below 19.5 %."""
    scene = whole()
    scene.site.altitude_m = altitude_m
    scene.site.save()
    Task.objects.filter(pk=scene.task.pk).update(oxygen="measured", oxygen_percent=percent)
    scene.assembly.respirator_class, scene.assembly.element = "sar_cf_half", None
    scene.assembly.save()
    assert ("idlh-class" in codes(scene)) is is_idlh
    scene.assembly.respirator_class, scene.assembly.element = "apr_half", scene.element
    scene.assembly.save()
    assert "oxygen-low" in codes(scene)


# Class


def test_a_combined_cartridge_holds_a_low_boiling_vapour_no_longer():
    scene = vapour(boiling_point_c=56.0)
    scene.element.gas_elements = ["OV", "AM"]
    scene.element.save()
    assert "gas-low-boiling" in codes(scene)


def test_a_gas_held_by_a_cartridge_of_its_own_may_boil_low():
    scene = vapour(boiling_point_c=-33.0, us_filter_need="AM")
    scene.element.gas_elements = ["OV", "AM"]
    scene.element.save()
    assert "gas-low-boiling" not in codes(scene)


def test_an_unknown_boiling_point_on_an_ordinary_cartridge_is_told():
    assert "boiling-point-unknown" in codes(vapour(boiling_point_c=None))


def test_a_filter_need_that_is_no_word_of_the_pack_breaks_the_class_not_the_page():
    assert "gas-need-unknown" in codes(vapour(us_filter_need="organic"))


def test_a_cartridge_approved_by_name_asks_for_the_name_on_its_label():
    """42 CFR 84.190: acid gases are approved one by one (memory)."""
    scene = vapour(us_filter_need="AG", boiling_point_c=-10.0)
    scene.element.gas_elements = ["AG"]
    scene.element.save()
    assert "element-label" in codes(scene)


def test_formaldehyde_asks_for_goggles_over_a_half_mask():
    scene = vapour(key="50-00-0", us_filter_need="FM")
    scene.element.gas_elements = ["FM"]
    scene.element.save()
    assert "eyes-goggles" in codes(scene)


@pytest.mark.parametrize(("times", "is_found"), [(20, False), (200, True)])
def test_butadiene_is_held_to_the_table_of_its_own_standard(times, is_found):
    """29 CFR 1910.1051(h)(3)(i) Table 1 (verified): a half mask to 10 ppm, then a full one."""
    scene = vapour(key="106-99-0", boiling_point_c=-4.0)
    scene.element.gas_elements = ["BD"]
    scene.element.save()
    for one in scene.samples:
        Sample.objects.filter(pk=one.pk).update(value=one.value * times)
    assert ("substance-table" in codes(scene)) is is_found


def test_the_maximum_use_concentration_stops_at_the_ceiling_of_the_element():
    """42 CFR 84.190 (memory): organic-vapour cartridges to 1000 ppm; 10 x 500 ppm is above it."""
    scene = vapour()
    scene.limit.value = 500.0
    scene.limit.save()
    rows = {row.label: row.text for row in judged(scene).links[3].workings[0].rows}
    text = rows[f"Maximum use concentration, {scene.agent.name}"]
    assert text.endswith("000 ppm (capped by the element's own maximum)")


# Face


def test_a_protocol_that_is_not_for_the_facepiece_does_not_count():
    """29 CFR 1910.134 App. A I.C.6 (memory): no negative pressure test of a filtering facepiece."""
    scene = whole()
    scene.facepiece.kind = "filtering_facepiece"
    scene.facepiece.save()
    scene.assembly.respirator_class = "apr_filtering_facepiece"
    scene.assembly.save()
    assert codes(scene) == set()
    FitTest.objects.update(protocol="cnp_redon")
    assert "fit-protocol" in codes(scene)


def test_a_protocol_that_is_not_known_does_not_count():
    scene = whole()
    FitTest.objects.update(protocol="somebody's own")
    assert "fit-protocol" in codes(scene)


def test_a_passed_test_with_too_few_exercises_does_not_count():
    scene = whole()
    scene.fit_test.exercises.filter(order__gt=3).delete()
    assert "fit-incomplete" in codes(scene)


def test_a_qualitative_test_of_a_full_facepiece_supports_no_unknown_ratio():
    """29 CFR 1910.134(f)(6) (verified): at most ten times the limit."""
    scene = whole()
    scene.facepiece.kind = "full_facepiece"
    scene.facepiece.save()
    scene.assembly.respirator_class = "apr_full"
    scene.assembly.save()
    FitTest.objects.update(protocol="saccharin")
    assert "apf-cap-fit-method" not in codes(scene)
    Sample.objects.all().delete()
    assert "apf-cap-fit-method" in codes(scene)


def test_a_clearance_with_limits_that_names_none_is_no_clearance():
    scene = whole()
    scene.worker.clearances.update(outcome="able_with_limits")
    assert "medical-limits" in codes(scene)


def test_an_assembly_that_is_not_assigned_lets_nobody_start():
    scene = whole()
    scene.member.assembly = b.make_assembly(scene.site, scene.facepiece)
    scene.member.save()
    chain = judged(scene)
    assert "crew-other-assembly" in {m.code for m in chain.mismatches}
    assert chain.may_start == 0


# Filter


@pytest.mark.parametrize(
    ("shifts", "a_week", "days"),
    [
        (3, 5, 3),
        (4, 5, 4),
        (5, 5, 7),
        (8, 5, 10),
        (10, 5, 14),
        (2, 1, 14),
        (4, 14, 2),
        (3, 0.5, 42),
    ],
)
def test_no_run_of_working_days_outlasts_the_shifts_of_a_filter(shifts, a_week, days):
    """Common practice: shifts may follow on one another from the first day."""
    assert days_of(shifts, a_week=a_week) == days


@pytest.mark.parametrize("left", [0, -1, -30], ids=["none", "one over", "many over"])
def test_a_filter_with_no_shifts_left_is_due_at_once(left):
    assert days_of(left, a_week=5) <= 0


def test_more_shifts_used_than_a_filter_has_is_overdue():
    scene = whole()
    change = scene.worker.filter_changes.get()
    change.shifts_used = 2000
    change.save()
    assert "filter-due" in codes(scene)


def test_a_filter_fitted_tomorrow_at_the_site_is_not_fitted_today():
    scene = whole()
    scene.site.time_zone = "Pacific/Auckland"
    scene.site.save()
    tomorrow = datetime(2026, 3, 2, 20, tzinfo=UTC)
    scene.worker.filter_changes.update(fitted_at=tomorrow)
    assert "filter-unknown" in codes(scene)
    assert "filter-unknown" not in codes(scene, b.DAY + timedelta(days=1))


def test_one_substance_with_a_table_gives_the_others_no_schedule():
    scene = vapour(key="106-99-0", boiling_point_c=-4.0)
    scene.element.gas_elements, scene.element.cartridge_life_source = ["BD", "OV"], ""
    scene.element.save()
    assert "change-schedule" not in codes(scene)
    other = b.make_agent("Invented thinner", kind="vapour", us_filter_need="OV")
    b.make_task_agent(scene.task, other, form="gas", fraction="vapour")
    assert "change-schedule" in codes(scene)


def test_a_dust_sampled_as_respirable_beside_a_coarse_one_leaves_the_load_unknown():
    scene = whole()
    scene.task_agent.dust_load_mg_m3 = None
    scene.task_agent.save()
    coarse = b.make_agent("Chalk dust")
    b.make_limit(coarse, 10.0, fraction="inhalable")
    group = b.make_task_agent(scene.task, coarse, fraction="inhalable")
    for value in (0.2, 0.5, 0.3, 0.8, 0.4, 0.6):
        b.make_sample(group, value)
    assert "dust-load-unknown" in codes(scene)


def test_of_two_deposits_the_one_that_clogs_first_sets_the_schedule():
    scene = whole()
    before = judged(scene).links[5].workings[0].figures["hours"]
    fume = b.make_agent("A fume", kind="fume")
    b.make_limit(fume, 5.0)
    group = b.make_task_agent(scene.task, fume, cake="coarse_dust")
    b.make_sample(group, 0.1)
    assert judged(scene).links[5].workings[0].figures["hours"] == before


def test_a_mask_without_a_filter_is_not_taken_for_supplied_air():
    scene = whole()
    scene.assembly.element = None
    scene.assembly.save()
    chain = judged(scene)
    assert chain.links[5].state == "broken"
    assert "element-missing" in {m.code for m in chain.mismatches}


def test_the_chain_of_a_day_before_the_task_knows_no_crew():
    scene = whole()
    assert assess(scene.task, on=date(2020, 1, 1)).may_start == 0

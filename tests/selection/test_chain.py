import json
from datetime import date, time, timedelta

import pytest

from exposure.models import Sample, Task
from programme.roster.models import Clearance, Training
from programme.selection.chain import BROKEN, HOLDS, LINKS
from tests import builders as b
from tests.selection.scene import codes, judged, whole

pytestmark = pytest.mark.django_db
LATER = b.DAY + timedelta(days=40)


@pytest.mark.parametrize("pack", ["us-2026-1", "gb-2026-1"])
def test_a_task_with_everything_in_order_has_nothing_against_it(pack):
    chain = judged(whole(pack))
    assert [m.says for m in chain.mismatches] == []
    assert [link.name for link in chain.links] == list(LINKS)
    assert chain.holds
    assert chain.verdict.startswith("All six links hold. 1 of 1 may start.")


def test_the_chain_can_be_written_as_strict_json():
    text = json.dumps(judged(whole()).as_dict(), default=str)
    assert json.loads(text)["holds"] is True


def no_samples(s):
    Sample.objects.all().delete()


def only_area_samples(s):
    Sample.objects.update(where="area")


def only_inside_samples(s):
    Sample.objects.update(where="inside")


def old_samples(s):
    Sample.objects.update(sampled_on=b.DAY - timedelta(days=1500))


def changed_process(s):
    Task.objects.filter(pk=s.task.pk).update(changed_on=b.DAY + timedelta(days=0))
    Sample.objects.update(sampled_on=b.DAY - timedelta(days=10))


def four_samples(s):
    for one in s.samples[4:]:
        one.delete()


def no_limit(s):
    s.limit.delete()


def oxygen_unknown(s):
    Task.objects.filter(pk=s.task.pk).update(oxygen="unknown")


def declared_idlh(s):
    Task.objects.filter(pk=s.task.pk).update(is_idlh=True)


def low_oxygen(s):
    Task.objects.filter(pk=s.task.pk).update(oxygen="measured", oxygen_percent=18.0)


def oily_air_and_n_filter(s):
    s.element.particulate_class = "N95"
    s.element.save()
    Task.objects.filter(pk=s.task.pk).update(has_oil_aerosol=True)


def vapour_too(s):
    s.task_agent.form = "both"
    s.task_agent.save()


def irritating(s):
    Task.objects.filter(pk=s.task.pk).update(irritates_eyes=True)


def no_approval(s):
    s.assembly.approval_number = ""
    s.assembly.save()


def odd_class(s):
    s.assembly.respirator_class = "no_such_class"
    s.assembly.save()


def no_assembly(s):
    s.task.assemblies.all().delete()


def too_much(s):
    Sample.objects.update(value=0.6)


def no_clearance(s):
    s.worker.clearances.all().delete()


def not_able(s):
    s.worker.clearances.update(outcome=Clearance.Outcome.NOT_ABLE)


def half_hour_only(s):
    s.worker.clearances.update(outcome="able_with_limits", max_hours_a_shift=0.5)


def no_training(s):
    s.worker.trainings.all().delete()


def trained_on_others(s):
    Training.objects.update(families=["scba"])


def bearded(s):
    b.make_seal_note(s.worker)


def face_changed(s):
    b.make_seal_note(s.worker, "face_change", b.DAY)
    s.worker.fit_tests.update(tested_on=b.DAY - timedelta(days=3))


def no_fit_test(s):
    s.fit_test.exercises.all().delete()
    s.fit_test.delete()


def other_size(s):
    s.member.size = b.size_of(s.facepiece, "L")
    s.member.save()


def no_size(s):
    s.member.size = None
    s.member.save()


def low_fit(s):
    s.fit_test.exercises.update(fit_factor=99.99)


def one_exercise_missing(s):
    one = s.fit_test.exercises.first()
    one.fit_factor = None
    one.save()


def failed_fit(s):
    b.make_fit_test(s.worker, s.fit_test.size, b.DAY, outcome="failed", fit_factors=(20.0,) * 7)


def no_filter_change(s):
    s.worker.filter_changes.all().delete()


def nobody(s):
    s.member.delete()


def worker_left(s):
    s.worker.active_to = b.DAY
    s.worker.save()


def load_unknown(s):
    s.task_agent.dust_load_mg_m3 = None
    s.task_agent.save()


BREAKS = {
    no_samples: ("exposure-unknown", "Air"),
    only_area_samples: ("exposure-unknown", "Air"),
    only_inside_samples: ("exposure-unknown", "Air"),
    old_samples: ("exposure-unknown", "Air"),
    changed_process: ("sample-before-change", "Air"),
    four_samples: ("sample-few", None),
    no_limit: ("limit-missing", "Limit"),
    oxygen_unknown: ("oxygen-unknown", "Ratio"),
    declared_idlh: ("idlh-class", "Class"),
    low_oxygen: ("oxygen-low", "Class"),
    oily_air_and_n_filter: ("oil", "Class"),
    vapour_too: ("gas-missing", "Class"),
    irritating: ("eyes", "Class"),
    no_approval: ("approval-missing", "Class"),
    odd_class: ("class-unknown", "Class"),
    no_assembly: ("class-missing", "Class"),
    too_much: ("apf-low", "Class"),
    no_clearance: ("medical-missing", "Face"),
    not_able: ("medical-not-able", "Face"),
    half_hour_only: ("medical-limits", "Face"),
    no_training: ("training-missing", "Face"),
    trained_on_others: ("training-type", "Face"),
    bearded: ("facial-hair", "Face"),
    face_changed: ("face-changed", "Face"),
    no_fit_test: ("fit-missing", "Face"),
    other_size: ("fit-size", "Face"),
    no_size: ("size-missing", "Face"),
    low_fit: ("fit-low", "Face"),
    one_exercise_missing: ("fit-low", "Face"),
    failed_fit: ("fit-low", "Face"),
    nobody: ("crew-empty", "Face"),
    worker_left: ("worker-inactive", "Face"),
    no_filter_change: ("filter-unknown", "Filter"),
    load_unknown: ("dust-load-unknown", "Filter"),
}


@pytest.mark.parametrize("broken", BREAKS, ids=lambda one: one.__name__)
def test_each_thing_amiss_is_found_at_its_link(broken):
    scene = whole()
    code, link = BREAKS[broken]
    assert code not in codes(scene)
    broken(scene)
    chain = judged(scene)
    assert code in {m.code for m in chain.mismatches}
    assert (chain.first_break.name if chain.first_break else None) == link
    if link is not None:
        assert chain.may_start == 0
        assert chain.state == BROKEN


@pytest.mark.parametrize("broken", BREAKS, ids=lambda one: one.__name__)
def test_every_mismatch_names_its_clause_and_a_remedy_or_a_reason(broken):
    scene = whole()
    broken(scene)
    for one in judged(scene).mismatches:
        assert one.source
        assert one.sure in {"verified", "computed", "memory"}
        assert one.says.endswith(".")


def test_a_fit_test_no_longer_counts_on_its_expiry_day():
    scene = whole()
    scene.worker.trainings.update(trained_on=date(2027, 2, 1))
    eve, day = date(2027, 3, 1), date(2027, 3, 2)
    b.make_filter_change(scene.worker, scene.assembly, eve)
    assert "fit-expired" not in codes(scene, eve)
    assert "fit-expired" in codes(scene, day)


def test_a_test_that_lapses_at_midnight_lapses_in_the_night_shift_before():
    scene = whole(starts_at=time(22), shift_h=8)
    scene.worker.trainings.update(trained_on=date(2027, 2, 1))
    assert "fit-expired" in codes(scene, date(2027, 3, 1))


def test_a_bad_exercise_outweighs_six_good_ones():
    scene = whole()
    scene.fit_test.exercises.update(fit_factor=200)
    first = scene.fit_test.exercises.first()
    first.fit_factor = 20
    first.save()
    # 7 / (6/200 + 1/20) = 87.5, although the plain mean is 174.
    assert "fit-low" in codes(scene)


def test_a_fit_factor_of_exactly_the_pass_level_passes():
    scene = whole()
    scene.fit_test.exercises.update(fit_factor=100)
    assert "fit-low" not in codes(scene)


def test_great_britain_wants_the_level_in_every_exercise():
    scene = whole("gb-2026-1")
    first = scene.fit_test.exercises.first()
    first.fit_factor = 90
    first.save()
    assert "fit-exercise-low" in codes(scene)


def test_a_high_fit_factor_raises_no_assigned_factor():
    scene = whole()
    scene.fit_test.exercises.update(fit_factor=20000)
    Sample.objects.update(value=0.6)
    assert "apf-low" in codes(scene)


def test_no_respirator_makes_up_for_an_unknown_exposure():
    scene = whole()
    Sample.objects.all().delete()
    scene.assembly.respirator_class = "scba_pd_full"
    scene.assembly.save()
    assert judged(scene).first_break.name == "Air"


def test_a_hood_needs_no_fit_test_and_bears_a_beard():
    scene = whole()
    hood = b.make_facepiece(scene.site, sizes=(), kind="helmet_or_hood")
    filters = b.make_element(
        scene.site, particulate_class="HE", area_cm2=600, clean_resistance_pa=100
    )
    powered = b.make_assembly(scene.site, hood, filters, respirator_class="papr_hood")
    scene.task.assemblies.all().delete()
    b.assign(scene.task, powered)
    scene.member.assembly, scene.member.size = powered, None
    scene.member.save()
    b.make_filter_change(scene.worker, powered)
    b.make_seal_note(scene.worker)
    no_fit_test(scene)
    assert codes(scene) == set()


def test_links_after_the_first_break_wait_on_it_and_keep_their_state():
    scene = whole()
    scene.limit.delete()
    chain = judged(scene)
    face = chain.links[4]
    assert face.waits_on == "Limit"
    assert face.state == HOLDS


def test_lead_on_a_twelve_hour_shift_is_held_to_33_micrograms():
    """29 CFR 1910.1025(c)(2): 400 divided by the hours worked (verified)."""
    scene = whole(shift_h=12)
    scene.agent.key = "7439-92-1"
    scene.agent.save()
    scene.limit.value = 0.05
    scene.limit.save()
    working = judged(scene).links[1].workings[0]
    assert working.figures["limit"] == pytest.approx(0.4 / 12, rel=1e-9)


WELDING = (0.84, 0.98, 0.42, 1.16, 1.36, 2.66)


def test_published_welding_results_give_their_hazard_ratio():
    """Teaching example n = 6, limit 5 mg/m3: UTL(95,70)/L = 0.80 (computed, noncentral t)."""
    scene = whole(results=WELDING)
    scene.limit.value = 5.0
    scene.limit.save()
    figures = judged(scene).links[2].workings[0].figures
    assert figures["ratio"] == pytest.approx(0.8000853206, rel=1e-5)


LEAD = (200, 120, 15, 7, 8, 6, 48, 61, 380, 80, 29, 1000, 350, 1400, 110)


def test_published_air_lead_results_give_their_hazard_ratio():
    """NIOSH HETA 89-052, in J Occup Environ Hyg 2006;3:642-650; limit 50 ug/m3 (computed)."""
    scene = whole(results=tuple(value / 1000 for value in LEAD))
    scene.limit.value = 0.05
    scene.limit.save()
    figures = judged(scene).links[2].workings[0].figures
    assert figures["ratio"] == pytest.approx(42.71391126, rel=1e-5)


def test_five_milligrams_at_moderate_work_load_72_milligrams_in_eight_hours():
    """5 mg/m3, 30 L/min, 8 h: 72 mg (computed: C x V x t)."""
    scene = whole(wear_h_per_shift=8)
    scene.task_agent.dust_load_mg_m3 = 5.0
    scene.task_agent.save()
    rows = {row.label: row.text for row in judged(scene).links[5].workings[0].rows}
    assert rows["Mass collected a shift"] == "72 mg"


def test_a_filter_is_overdue_on_its_change_day():
    scene = whole()
    chain = judged(scene)
    shifts = chain.links[5].workings[0].figures["shifts"]
    due = b.DAY + timedelta(days=int(shifts / 5 * 7))
    scene.worker.fit_tests.update(tested_on=due - timedelta(days=5))
    scene.worker.trainings.update(trained_on=due - timedelta(days=5))
    assert "filter-due" not in codes(scene, due - timedelta(days=1))
    assert "filter-due" in codes(scene, due)


def test_the_shortest_reason_binds_and_the_others_stay_visible():
    scene = whole()
    scene.site.filter_max_shifts = 2
    scene.site.save()
    working = judged(scene).links[5].workings[0]
    assert working.figures["reason"] == "site policy"
    assert "Breathing resistance" in {row.label for row in working.rows}


def test_a_worker_of_whom_nothing_is_known_does_not_hide_who_may_start():
    scene = whole()
    b.make_crew(scene.task, b.make_worker(scene.site), scene.assembly)
    chain = judged(scene)
    assert chain.first_break.name == "Face"
    assert chain.may_start == 1
    assert chain.links[4].figure == "1 of 2"


def vapour_scene(boiling_point_c):
    scene = whole()
    scene.agent.kind, scene.agent.us_filter_need = "vapour", "OV"
    scene.agent.boiling_point_c = boiling_point_c
    scene.agent.save()
    scene.task_agent.form = "gas"
    scene.task_agent.save()
    scene.element.gas_elements = ["OV"]
    scene.element.cartridge_life_h, scene.element.cartridge_life_source = 9, "invented test"
    scene.element.save()
    return scene


@pytest.mark.parametrize(("boils_at", "is_found"), [(56, True), (65, True), (110, False)])
def test_a_vapour_that_boils_low_passes_an_ordinary_cartridge_too_soon(boils_at, is_found):
    """EN 14387 sets type AX apart at 65 degrees Celsius (verified)."""
    assert ("gas-low-boiling" in codes(vapour_scene(boils_at))) is is_found


def test_ammonia_is_not_answered_by_an_organic_vapour_cartridge():
    scene = vapour_scene(110)
    scene.agent.us_filter_need = "AM"
    scene.agent.save()
    assert "gas-type" in codes(scene)


def test_a_cartridge_without_objective_data_has_no_schedule():
    scene = vapour_scene(110)
    scene.element.cartridge_life_source = ""
    scene.element.save()
    assert "change-schedule" in codes(scene)
    assert judged(scene).may_start == 0


@pytest.mark.parametrize(
    ("note", "severity"),
    [("IARC group 3", "plan"), ("IARC group 1", "fix"), ("", "plan")],
    ids=["not classifiable", "carcinogen", "none"],
)
def test_in_doubt_a_carcinogen_gets_the_higher_class(note, severity):
    scene = whole()
    scene.agent.carcinogen_note = note
    scene.agent.save()
    scene.limit.value = 0.0185
    scene.limit.save()
    found = [m for m in judged(scene).mismatches if m.code == "class-uncertain"]
    assert [one.severity for one in found] == [severity]


def test_counted_shifts_go_on_from_the_day_they_were_recorded():
    scene = whole()
    interval = judged(scene).links[5].workings[0].figures["shifts"]
    change = scene.worker.filter_changes.get()
    change.shifts_used = interval - 1
    change.save()
    recorded = scene.site.today(change.recorded_at)
    scene.worker.fit_tests.update(tested_on=recorded)
    scene.worker.trainings.update(trained_on=recorded)
    assert "filter-due" not in codes(scene, recorded)
    assert "filter-due" in codes(scene, recorded + timedelta(days=3))

"""The Great Britain pack against published class tables. Marks beside each; memory: unconfirmed."""

import pytest

from programme.rulepack.load import load


@pytest.fixture(scope="module")
def gb():
    return load("gb-2026-1")


# Published summary table of EN protection classes with assigned factors; the primary is
# HSE HSG53 (2013). (verified in that secondary table)
VERIFIED = {
    "ffp1": 4,
    "ffp2": 10,
    "ffp3": 20,
    "ffgas_p1": 4,
    "ffgas_p2": 10,
    "ffgas_p3": 10,
    "half_p1": 4,
    "half_p2": 10,
    "half_p3": 20,
    "half_gas": 10,
    "half_gas_p3": 10,
    "full_p2": 10,
    "full_p3": 40,
    "full_gas": 20,
    "full_gas_p3": 20,
    "th1": 10,
    "th2": 20,
    "th3": 40,
}
# HSE HSG53, Respiratory protective equipment at work, 4th ed. 2013 (memory)
RECALLED = {
    "full_p1": 4,
    "tm1": 10,
    "tm2": 20,
    "tm3": 40,
    "tm1_half": 10,
    "tm2_half": 20,
    "tm3_half": 40,
    "fah_full": 40,
    "ldh1": 10,
    "ldh2": 20,
    "ldh3": 40,
    "ldm1": 10,
    "ldm2": 20,
    "ldm3": 40,
    "cf_half": 20,
    "cf_full": 40,
    "cf_hood_1": 10,
    "cf_hood_2": 20,
    "cf_hood_3": 40,
    "cf_hood_4": 40,
    "suit": 200,
    "air_demand_neg": 40,
    "scba_demand_neg": 40,
    "air_demand_pos_half": 20,
    "air_demand_pos": 2000,
    "air_demand_pos_aux": 2000,
    "scba_pos": 2000,
}


@pytest.mark.parametrize(("class_id", "published"), VERIFIED.items(), ids=VERIFIED)
def test_the_summary_table_gives_these_factors(gb, class_id, published):
    row = gb.respirator_class(class_id)
    assert (row.apf, row.sure) == (published, "verified")


@pytest.mark.parametrize(("class_id", "recalled"), RECALLED.items(), ids=RECALLED)
def test_recalled_factors_are_marked_unconfirmed(gb, class_id, recalled):
    row = gb.respirator_class(class_id)
    assert row.apf == recalled
    assert row.is_unconfirmed


def test_no_class_stands_outside_the_two_tables(gb):
    assert {row.id for row in gb.classes} == VERIFIED.keys() | RECALLED.keys()


# EN 149 classes: filter efficiency at least 80, 94, 99 % (verified)
@pytest.mark.parametrize(
    ("filter_id", "published"), [("FFP1", 0.80), ("FFP2", 0.94), ("FFP3", 0.99)]
)
def test_filtering_facepieces_stop_what_en_149_prints(gb, filter_id, published):
    assert gb.particulate_filter(filter_id).efficiency_min == published


# EN 143: penetration at most 20, 6, 0.05 % (memory)
@pytest.mark.parametrize(("filter_id", "published"), [("P1", 0.80), ("P2", 0.94), ("P3", 0.9995)])
def test_particle_filters_stop_what_en_143_asks(gb, filter_id, published):
    row = gb.particulate_filter(filter_id)
    assert (row.efficiency_min, row.sure) == (published, "memory")


# EN 14387 summary tables (verified)
def test_gas_filter_classes_end_at_1000_5000_and_10000_ppm(gb):
    assert [(row.number, row.max_ppm) for row in gb.gas_classes] == [
        (1, 1000),
        (2, 5000),
        (3, 10000),
    ]


# EN 14387 summary tables (verified)
@pytest.mark.parametrize(
    ("element", "colour"),
    [
        ("A", "brown"),
        ("B", "grey"),
        ("E", "yellow"),
        ("K", "green"),
        ("AX", "brown"),
        ("SX", "violet"),
    ],
)
def test_gas_filters_bear_the_colour_of_their_type(gb, element, colour):
    assert gb.gas_element(element).colour == colour


# HSE INDG479 (rev1) March 2019 (memory)
def test_every_exercise_has_to_reach_100_or_2000(gb):
    half, full = (gb.pass_level(k, "quantitative") for k in ("half_mask", "full_facepiece"))
    assert (half.min_fit_factor, full.min_fit_factor) == (100, 2000)
    assert half.each_exercise_must_pass
    assert full.each_exercise_must_pass
    assert half.is_unconfirmed
    assert full.is_unconfirmed


# HSE INDG479 (rev1) March 2019 (memory)
def test_a_full_face_mask_is_not_tested_by_taste(gb):
    assert gb.pass_level("full_facepiece", "qualitative").allowed is False
    assert "full_facepiece" not in gb.protocol("taste_aerosol").applies_to


# HSE INDG479 (rev1) March 2019: seven exercises of a minute, no grimace (memory)
@pytest.mark.parametrize("protocol_id", ["ambient_aerosol_cnc", "generated_aerosol"])
def test_the_british_set_has_seven_exercises_and_no_grimace(gb, protocol_id):
    protocol = gb.protocol(protocol_id)
    assert [one.seconds for one in protocol.counted_exercises] == [60] * 7
    assert protocol.total_seconds == 420


# HSG53: a combined filter is limited by its gas figure; particles alone at the P3 figure (memory)
@pytest.mark.parametrize(
    ("class_id", "gas", "dust"), [("half_gas_p3", 10, 20), ("full_gas_p3", 20, 40)]
)
def test_a_combined_filter_has_the_gas_figure_unless_only_particles_are_met(
    gb, class_id, gas, dust
):
    row = gb.respirator_class(class_id)
    assert row.apf_when(has_maker_evidence=False) == gas
    assert row.apf_when(has_maker_evidence=False, is_particulate_only=True) == dust
    assert row.apf_particulate_only_sure == "memory"


# EN 14387 summary tables: type AX for organic vapours boiling at or below 65 C (verified)
def test_vapours_boiling_at_65_c_or_less_are_not_for_type_a(gb):
    assert gb.low_boiling.boiling_point_c == 65
    assert gb.low_boiling.ordinary_elements == ("A",)

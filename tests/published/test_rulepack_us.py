"""The United States pack against the printed law; marks beside each, memory means unconfirmed."""

import pytest

from programme.rulepack.load import load

# 29 CFR 1910.134(d)(3)(i)(A) Table 1, rows as printed; columns quarter mask, half mask, full
# facepiece, helmet/hood, loose-fitting facepiece. None: the cell is blank, nothing is assigned.
# "Half mask" includes filtering facepieces (note 3); 25 of helmets and hoods: note 4. (verified)
COLUMNS = (
    "quarter_mask",
    "half_mask",
    "full_facepiece",
    "helmet_or_hood",
    "loose_fitting_facepiece",
)
TABLE_1 = {
    ("air_purifying", "negative_pressure"): (5, 10, 50, None, None),
    ("powered_air_purifying", "powered"): (None, 50, 1000, 25, 25),
    ("supplied_air", "demand"): (None, 10, 50, None, None),
    ("supplied_air", "continuous_flow"): (None, 50, 1000, 25, 25),
    ("supplied_air", "pressure_demand"): (None, 50, 1000, None, None),
    ("scba", "demand"): (None, 10, 50, 50, None),
    ("scba", "pressure_demand"): (None, None, 10000, 10000, None),
}
CELLS = [
    (family, mode, inlet, apf)
    for (family, mode), row in TABLE_1.items()
    for inlet, apf in zip(COLUMNS, row, strict=True)
]


@pytest.fixture(scope="module")
def us():
    return load("us-2026-1")


def _factors(pack, family, mode, inlet):
    kind = (family, mode, inlet)
    return {row.apf for row in pack.classes if (row.family, row.mode, row.inlet) == kind}


@pytest.mark.parametrize(("family", "mode", "inlet", "apf"), CELLS, ids=str)
def test_every_cell_of_table_1_has_its_factor_and_blank_cells_have_none(
    us, family, mode, inlet, apf
):
    assert _factors(us, family, mode, inlet) == (set() if apf is None else {apf})


def test_nothing_is_assigned_outside_table_1_but_what_note_3_adds(us):
    outside = [
        row.id
        for row in us.classes
        if (row.family, row.mode) not in TABLE_1 or row.inlet not in COLUMNS
    ]
    assert outside == ["apr_filtering_facepiece"]


# 29 CFR 1910.134(d)(3)(i)(A) Table 1 note 3 (verified)
def test_a_filtering_facepiece_counts_as_a_half_mask(us):
    assert us.respirator_class("apr_filtering_facepiece").apf == 10


# 29 CFR 1910.134(d)(3)(i)(A) Table 1 note 4 (verified)
def test_only_powered_and_continuous_flow_hoods_reach_1000_with_evidence(us):
    raised = {row.id for row in us.classes if row.apf_with_maker_evidence == 1000}
    assert raised == {"papr_hood", "sar_cf_hood"}


# 29 CFR 1910.134(d)(2)(i)(A) and (B) (verified)
def test_two_types_are_permitted_where_the_air_is_immediately_dangerous(us):
    assert {row.id for row in us.classes if row.idlh} == {"scba_pd_full", "sar_pd_full_aux"}
    assert us.idlh.service_life_min == 30


# 29 CFR 1910.134(f)(7) (verified)
@pytest.mark.parametrize(
    ("kind", "published"),
    [
        ("filtering_facepiece", 100),
        ("quarter_mask", 100),
        ("half_mask", 100),
        ("full_facepiece", 500),
    ],
)
def test_quantitative_pass_levels_are_100_and_500(us, kind, published):
    level = us.pass_level(kind, "quantitative")
    assert level.min_fit_factor == published
    assert level.each_exercise_must_pass is False


# 29 CFR 1910.134(f)(6): factor of 100 or less, over a safety factor of 10 (computed)
def test_a_qualitative_test_caps_an_air_purifying_full_facepiece_at_10(us):
    level = us.pass_level("full_facepiece", "qualitative")
    assert level.cap_for(us.respirator_class("apr_full")) == 10
    assert level.cap_for(us.respirator_class("papr_full")) is None
    assert level.sure == "computed"


# 29 CFR 1910.134 App. A I.A.14 (verified); sum 435 s, 420 s without grimace (computed)
STANDARD = [
    ("Normal breathing", 60),
    ("Deep breathing", 60),
    ("Turning head side to side", 60),
    ("Moving head up and down", 60),
    ("Talking", 60),
    ("Grimace", 15),
    ("Bending over", 60),
    ("Normal breathing (again)", 60),
]


@pytest.mark.parametrize("protocol_id", ["ambient_aerosol_cnc", "generated_aerosol"])
def test_the_standard_exercises_stand_in_order_and_take_435_seconds(us, protocol_id):
    protocol = us.protocol(protocol_id)
    assert [(one.name, one.seconds) for one in protocol.exercises] == STANDARD
    assert protocol.total_seconds == 435


@pytest.mark.parametrize("protocol_id", ["ambient_aerosol_cnc", "generated_aerosol"])
def test_the_grimace_is_performed_and_does_not_count(us, protocol_id):
    left_out = [one.id for one in us.protocol(protocol_id).exercises if not one.counted]
    assert left_out == ["grimace"]


@pytest.mark.parametrize(
    "protocol_id", ["isoamyl_acetate", "saccharin", "denatonium", "irritant_smoke"]
)
def test_qualitative_tests_have_no_grimace_and_take_420_seconds(us, protocol_id):
    protocol = us.protocol(protocol_id)
    assert "grimace" not in [one.id for one in protocol.exercises]
    assert protocol.total_seconds == 420


# 29 CFR 1910.134 App. A I.C.4 Table A-1 and I.C.5 Table A-2 (verified); sum 149 s (computed)
@pytest.mark.parametrize(
    ("protocol_id", "second"),
    [("modified_cnc_elastomeric", "jogging"), ("modified_cnc_ffr", "talking")],
)
def test_the_modified_protocols_have_four_exercises_in_149_seconds(us, protocol_id, second):
    protocol = us.protocol(protocol_id)
    assert [(one.id, one.seconds) for one in protocol.exercises] == [
        ("bending_over", 50),
        (second, 30),
        ("head_side_to_side", 30),
        ("head_up_down", 39),
    ]
    assert protocol.total_seconds == 149
    assert all(one.counted for one in protocol.exercises)


# 29 CFR 1910.134 App. A I.C.6 (verified); 1+1+2+2+1+0+1+1 = 9 readings (computed)
def test_controlled_negative_pressure_takes_nine_readings_and_none_after_the_grimace(us):
    readings = [one.readings for one in us.protocol("cnp").exercises]
    assert readings == [1, 1, 2, 2, 1, 0, 1, 1]


# 29 CFR 1910.134 App. A I.C.7 Table A-3 (verified)
def test_the_redonning_protocol_counts_five_exercises(us):
    protocol = us.protocol("cnp_redon")
    assert [one.id for one in protocol.exercises] == [
        "facing_forward",
        "bending_over",
        "head_shaking",
        "redon_1",
        "redon_2",
    ]
    assert len(protocol.counted_exercises) == 5


# 42 CFR 84.170, wording before the 2020 renumbering (verified)
@pytest.mark.parametrize("series", ["N", "R", "P"])
@pytest.mark.parametrize(("grade", "published"), [(95, 0.95), (99, 0.99), (100, 0.9997)])
def test_filter_efficiencies_are_those_of_the_nine_classes(us, series, grade, published):
    row = us.particulate_filter(f"{series}{grade}")
    assert (row.efficiency_min, row.rank) == (published, grade)


# 42 CFR 84.170(b) (verified)
@pytest.mark.parametrize("grade", [95, 99, 100])
def test_series_n_is_for_air_free_of_oil(us, grade):
    assert us.particulate_filter(f"N{grade}").oil == "no"
    assert us.particulate_filter(f"P{grade}").oil == "yes"


# 29 CFR 1910.134(b), HEPA filter (verified)
def test_series_100_is_equivalent_to_hepa_and_no_other_series(us):
    equal = {row.id for row in us.particulate_filters if row.hepa_equivalent and row.rank == 100}
    assert {"N100", "R100", "P100"} <= equal
    assert not any(row.hepa_equivalent for row in us.particulate_filters if row.rank < 100)


# 29 CFR 1910.134(d)(2)(iii) Table II (verified)
TABLE_II = [(3000, 16.0), (4000, 16.4), (5000, 17.1), (6000, 17.8), (7000, 18.5), (8000, 19.3)]


def test_the_oxygen_bands_are_those_of_table_ii(us):
    bands = us.oxygen.altitude_bands
    assert [(band.up_to_ft, band.oxygen_min_percent) for band in bands] == TABLE_II
    assert {band.oxygen_max_percent for band in bands} == {19.5}


# 29 CFR 1910.134(b) (verified)
def test_oxygen_is_deficient_under_19_5_percent(us):
    assert us.oxygen.min_percent == 19.5


# 29 CFR 1910.134(f)(2) and (k)(5) (verified)
def test_fit_test_and_training_hold_twelve_months(us):
    assert us.interval("fit").months == us.interval("training").months == 12


# 29 CFR 1910.1051(h)(3)(i) Table 1 (verified)
@pytest.mark.parametrize(
    ("ppm", "hours"), [(5, 4), (5.01, 3), (10, 3), (25, 2), (50, 1), (51, None), (1000, None)]
)
def test_butadiene_elements_last_as_its_own_table_says(us, ppm, hours):
    assert us.substance("106-99-0").hours_at(ppm).hours == hours


# 29 CFR 1910.1025(c): 400 over the hours worked; a 10 h shift gives 40 ug/m3 (memory)
def test_the_lead_limit_shrinks_with_a_longer_shift(us):
    rule = us.substance("7439-92-1").extended_shift
    assert rule.limit_ug_m3(10.0) == 40.0
    assert rule.limit_ug_m3(8.0) is None
    assert rule.is_unconfirmed


# 29 CFR 1926.62(f)(3)(i)(C), 1926.1127(g)(3)(i)(C), 1926.1101(h)(3)(i)(B) (verified);
# recalled for arsenic and methylenedianiline: 1910.1018(h)(3), 1910.1050(h) (memory)
@pytest.mark.parametrize(
    ("cas", "sure"),
    [
        ("7439-92-1", "verified"),
        ("7440-43-9", "verified"),
        ("1306-19-0", "verified"),
        ("1332-21-4", "verified"),
        ("7440-38-2", "memory"),
        ("101-77-9", "memory"),
    ],
    ids=["lead", "cadmium", "cadmium oxide", "asbestos", "arsenic", "methylenedianiline"],
)
def test_some_substances_ask_for_a_series_100_filter(us, cas, sure):
    rule = us.substance(cas).particulate_rank
    assert (rule.rank_min, rule.sure) == (100, sure)


# 29 CFR 1926.1101(h)(3)(i)(A), 1910.1047(g)(3) (verified)
def test_asbestos_bars_filtering_facepieces_and_ethylene_oxide_all_half_masks(us):
    assert us.substance("1332-21-4").inlets.barred == ("filtering_facepiece",)
    assert "half_mask" in us.substance("75-21-8").inlets.barred


# 42 CFR 84.190(b) (memory)
@pytest.mark.parametrize(
    ("element", "cas", "ppm"),
    [
        ("AM", "7664-41-7", 300),
        ("AG", "7782-50-5", 10),
        ("AG", "7647-01-0", 50),
        ("AM", "74-89-5", 100),
        ("OV", "108-88-3", 1000),
        ("AG", "7446-09-5", 50),
        ("VC", "75-01-4", 10),
    ],
    ids=["ammonia", "chlorine", "HCl", "methylamine", "organic vapour", "SO2", "vinyl chloride"],
)
def test_cartridges_have_their_highest_concentration(us, element, cas, ppm):
    cap = us.element_caps([element], cas=cas)[0]
    assert (cap.max_ppm, cap.sure) == (ppm, "memory")


# 29 CFR 1910.1053(b)-(c) (verified); 1910.1025(c) (memory)
@pytest.mark.parametrize(
    ("cas", "level_mg_m3", "sure"),
    [("14808-60-7", 0.025, "verified"), ("7439-92-1", 0.03, "memory")],
    ids=["silica", "lead"],
)
def test_action_levels_of_silica_and_lead(us, cas, level_mg_m3, sure):
    level = us.substance(cas).action_level
    assert (level.value, level.unit, level.sure) == (level_mg_m3, "mg/m3", sure)


# 29 CFR 1926.1153(d)(2)(iii), 1926.62(d)(6) (verified)
@pytest.mark.parametrize("cas", ["14808-60-7", "7439-92-1"], ids=["silica", "lead"])
def test_silica_and_lead_are_measured_again_after_6_or_3_months(us, cas):
    rule = us.substance(cas).monitoring
    assert (rule.from_action_level_months, rule.above_limit_months) == (6, 3)


def test_powered_filters_are_loaded_at_their_blower_flow():
    """42 CFR 84.175(d): 115 L/min tight-fitting, 170 L/min loose-fitting (verified)."""
    flow = load("us-2026-1").powered_flow
    assert (flow.flow_l_min(is_tight=True), flow.flow_l_min(is_tight=False)) == (115, 170)


def test_a_list_prints_its_twins_for_24_45_litres_a_mole():
    """25 degrees Celsius and 760 mm Hg: footnotes of the limits tables, restated (verified)."""
    pack = load("us-2026-1")
    assert pack.list_reference("US-PEL").molar_volume_l_mol == 24.45
    assert pack.list_reference("SITE") == pack.list_reference("US-PEL")

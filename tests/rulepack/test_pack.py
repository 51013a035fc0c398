"""What a rule pack answers, and that it never answers the unknown with a pass."""

import dataclasses
import math

import pytest

from programme.rulepack.load import available, load
from programme.rulepack.rows import SURE, Row

NAMES = ["gb-2026-1", "us-2026-1"]


@pytest.fixture(params=NAMES)
def pack(request):
    return load(request.param)


@pytest.fixture(scope="module")
def us():
    return load("us-2026-1")


@pytest.fixture(scope="module")
def gb():
    return load("gb-2026-1")


def _rows(value):
    if isinstance(value, Row):
        yield value
    if dataclasses.is_dataclass(value):
        for spec in dataclasses.fields(value):
            yield from _rows(getattr(value, spec.name))
    elif isinstance(value, tuple):
        for one in value:
            yield from _rows(one)


def test_every_row_has_a_source_and_a_mark(pack):
    rows = list(_rows(pack))
    assert len(rows) > 150
    assert all(row.source.strip() and row.sure in SURE for row in rows)


def test_two_packs_are_shipped_and_name_their_edition():
    assert [(info.name, info.edition) for info in available()] == [
        ("gb-2026-1", "2026-1"),
        ("us-2026-1", "2026-1"),
    ]


def test_both_packs_answer_the_same_topics(us, gb):
    assert [row.code for row in us.clauses] == [row.code for row in gb.clauses]
    for name in ("fit", "training", "medical"):
        assert us.interval(name)
        assert gb.interval(name)


@pytest.mark.parametrize(
    ("ratio", "apf"), [(0, 5), (5, 5), (5.001, 10), (10, 10), (25.1, 50), (10000, 10000)]
)
def test_the_required_factor_is_the_next_of_the_table(us, ratio, apf):
    assert us.required_apf(ratio) == apf


@pytest.mark.parametrize("ratio", [math.nan, math.inf, 10000.1])
def test_no_factor_answers_an_unknown_or_too_high_ratio(us, ratio):
    assert us.required_apf(ratio) is None


def test_a_negative_ratio_is_refused(us):
    with pytest.raises(ValueError, match=r"^ratio: -1; it must be 0 or more"):
        us.required_apf(-1)


def test_classes_for_a_factor_come_lowest_first(us):
    factors = [row.apf for row in us.classes_with_apf(50)]
    assert factors == sorted(factors)
    assert factors[0] == 50


def test_no_class_answers_an_unknown_factor(us):
    assert us.classes_with_apf(math.nan) == ()


def test_a_hood_counts_for_1000_only_with_the_makers_evidence(us):
    hood = us.respirator_class("papr_hood")
    assert hood not in us.classes_with_apf(50)
    assert hood in us.classes_with_apf(50, has_maker_evidence=True)


def test_the_makers_evidence_raises_no_class_that_does_not_allow_it(us):
    row = us.respirator_class("papr_loose")
    assert row.apf_when(has_maker_evidence=True) == 25


@pytest.mark.parametrize(
    ("ask", "wanted", "message"),
    [
        ("respirator_class", "apr_none", r"^respirator class: 'apr_none' .*apr_quarter, apr_half"),
        ("particulate_filter", "N94", r"^particulate filter: 'N94' .*N95"),
        ("gas_element", "XX", r"^gas element: 'XX' .*OV, AG"),
        ("protocol", "blowing", r"^protocol: 'blowing' .*ambient_aerosol_cnc"),
        ("clause", "no-such", r"^clause: 'no-such'; .*fit-missing"),
    ],
)
def test_an_unknown_id_is_refused_with_those_there_are(us, ask, wanted, message):
    with pytest.raises(ValueError, match=message):
        getattr(us, ask)(wanted)


def test_what_another_pack_knew_can_be_looked_for(us):
    assert us.find_class("half_p3") is None
    assert us.find_protocol("taste_aerosol") is None
    assert us.find_class("apr_half") is us.respirator_class("apr_half")


def test_a_kind_without_a_pass_level_has_none(us, gb):
    assert us.pass_level("helmet_or_hood", "quantitative") is None
    assert gb.pass_level("quarter_mask", "quantitative") is None


def test_an_unknown_method_is_refused(us):
    with pytest.raises(ValueError, match=r"^method: 'guess'; it must be one of quantitative"):
        us.pass_level("half_mask", "guess")


def test_every_tight_class_can_be_fit_tested(pack):
    kinds = {row.inlet for row in pack.classes if row.is_tight}
    for kind in kinds:
        assert pack.pass_level(kind, "quantitative").min_fit_factor >= 100
        assert pack.protocols_for(kind)


def test_protocols_offered_fit_the_method_the_pass_level_allows(pack):
    for protocol in pack.protocols:
        for kind in protocol.applies_to:
            assert pack.pass_level(kind, protocol.method).allowed


def test_negative_pressure_is_not_measured_on_a_filtering_facepiece(us):
    offered = {row.id for row in us.protocols_for("filtering_facepiece")}
    assert not offered & {"cnp", "cnp_redon"}


@pytest.mark.parametrize(
    ("inlet", "tight", "eyes"),
    [
        ("filtering_facepiece", True, False),
        ("quarter_mask", True, False),
        ("half_mask", True, False),
        ("full_facepiece", True, True),
        ("helmet_or_hood", False, True),
        ("loose_fitting_facepiece", False, False),
    ],
)
def test_an_inlet_seals_or_not_and_covers_the_eyes_or_not(us, inlet, tight, eyes):
    row = next(row for row in us.classes if row.inlet == inlet)
    assert (row.is_tight, row.covers_eyes) == (tight, eyes)


@pytest.mark.parametrize(
    ("class_id", "particulate", "has_gas", "taken"),
    [
        ("half_p3", "P3", False, True),
        ("half_p3", "P2", False, False),
        ("half_p3", "P3", True, False),
        ("half_p3", "", False, False),
        ("half_gas_p3", "P3", True, True),
        ("half_gas", "", True, True),
        ("ffp3", "FFP3", False, True),
        ("th3", "TH3P", True, True),
        ("th3", "TH1P", False, False),
        ("scba_pos", "", False, True),
    ],
)
def test_a_factor_holds_only_with_the_elements_of_its_class(
    gb, class_id, particulate, has_gas, taken
):
    row = gb.respirator_class(class_id)
    assert row.takes_element(particulate, has_gas=has_gas) is taken


def test_an_american_class_holds_with_any_element(us):
    assert us.respirator_class("apr_half").takes_element("N95", has_gas=True)


def test_needs_are_read_code_by_code(us):
    assert us.needs("OV+particulate") == ("OV", "particulate")
    assert us.needs("") == ()
    with pytest.raises(ValueError, match=r"^filter need: 'ZZ'; it must be one of particulate"):
        us.needs("OV+ZZ")


@pytest.mark.parametrize(
    ("elements", "need", "cas", "covered"),
    [
        (["OV"], "OV", "108-88-3", True),
        (["OV"], "OV+particulate", "584-84-9", True),
        (["OV"], "AM", "7664-41-7", False),
        (["AM"], "AM", "7664-41-7", True),
        (["OV_AG_AM"], "AM", "7664-41-7", True),
        (["OV"], "", "108-88-3", False),
        (["unheard-of"], "OV", "108-88-3", False),
        ([], "OV", "108-88-3", False),
        (["BD"], "OV", "106-99-0", True),
        (["BD"], "OV", "108-88-3", False),
        (["OV"], "supplied-air-only", "67-56-1", False),
        (["OV"], "particulate", "", False),
    ],
)
def test_a_gas_element_covers_the_need_it_is_made_for(us, elements, need, cas, covered):
    assert us.covers_gas(elements, needs=us.needs(need), cas=cas) is covered


def test_low_boiling_vapours_need_their_own_british_filter(gb):
    assert not gb.covers_gas(["A"], needs=gb.needs("AX"), cas="67-64-1")
    assert gb.covers_gas(["AX"], needs=gb.needs("AX"), cas="67-64-1")


def test_gas_elements_for_a_need_are_listed(us, gb):
    assert [row.id for row in gb.gas_elements_for(("A", "P"), cas="")] == ["A"]
    assert "BD" in [row.id for row in us.gas_elements_for(("OV",), cas="106-99-0")]
    assert us.gas_elements_for((), cas="") == ()


def test_a_gas_filter_of_unknown_class_has_the_ceiling_of_the_lowest(gb):
    assert [row.max_ppm for row in gb.element_caps(["A"], cas="108-88-3")] == [1000]
    assert [row.max_ppm for row in gb.element_caps(["A"], cas="108-88-3", gas_class=2)] == [5000]


def test_ceilings_come_lowest_first(us):
    caps = us.element_caps(["OV_AG_AM"], cas="7664-41-7")
    assert [row.max_ppm for row in caps] == [300, 1000]


def test_some_agents_are_not_for_cartridges_but_for_those_made_for_them(us):
    assert us.not_for("75-09-2", ["OV"]).name == "methylene chloride"
    assert us.not_for("630-08-0", ["OV"]) is not None
    assert us.not_for("630-08-0", ["CO"]) is None
    assert us.not_for("108-88-3", ["OV"]) is None


def test_diisocyanates_may_be_met_with_a_schedule(us):
    assert us.not_for("584-84-9").allowed_with_schedule


def test_an_agent_without_a_number_has_no_substance_rule(pack):
    assert pack.substance("") is None


def test_the_own_table_of_a_substance_ends(us):
    assert us.substance("106-99-0").hours_at(1000.1) is None
    assert us.substance("106-99-0").hours_at(math.nan) is None


def test_oil_shortens_the_use_of_r_and_p_filters(us):
    assert us.filter_use_limit("R", has_oil=True).hours == 8
    assert us.filter_use_limit("P", has_oil=True).days == 30
    assert us.filter_use_limit("N", has_oil=True) is None


@pytest.mark.parametrize(
    ("oxygen", "altitude_m", "allowed"),
    [
        (16.0, 0.0, True),
        (15.9, 0.0, False),
        (17.0, 1500.0, False),
        (17.1, 1500.0, True),
        (19.4, 2500.0, False),
        (math.nan, 0.0, False),
        (18.0, math.nan, False),
    ],
)
def test_altitude_decides_how_little_oxygen_an_airline_may_meet(us, oxygen, altitude_m, allowed):
    assert us.allows_any_supplied_air(oxygen, altitude_m=altitude_m) is allowed


def test_a_pack_without_altitude_bands_makes_no_exception(gb):
    assert not gb.allows_any_supplied_air(19.0, altitude_m=0.0)


def test_a_pack_cannot_be_changed(us):
    with pytest.raises(dataclasses.FrozenInstanceError):
        us.respirator_class("apr_half").apf = 1000

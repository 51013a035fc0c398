"""Which parts belong together by the rule pack."""

import pytest

from programme.equipment.fitting import assigned_factor, misfits, parts_of
from programme.equipment.models import Assembly, Element, Facepiece
from programme.rulepack.load import load

US, GB = load("us-2026-1"), load("gb-2026-1")
P100 = Element(name="Filter A", particulate_class="P100")
OV = Element(name="Cartridge B", gas_elements=["OV"])
P3 = Element(name="Filter C", particulate_class="P3")
P2 = Element(name="Filter D", particulate_class="P2")
A_P3 = Element(name="Filter E", particulate_class="P3", gas_elements=["A"])


def made(kind, respirator_class, element=None, **fields):
    facepiece = Facepiece(name="Alder", kind=kind)
    return Assembly(
        facepiece=facepiece, respirator_class=respirator_class, element=element, **fields
    )


@pytest.mark.parametrize(
    ("assembly", "pack"),
    [
        (made("half_mask", "apr_half", P100), US),
        (made("full_facepiece", "apr_full", OV), US),
        (made("helmet_or_hood", "papr_hood", P100, maker_evidence="study 7"), US),
        (made("full_facepiece", "scba_pd_full", service_life_min=30), US),
        (made("full_facepiece", "sar_pd_full"), US),
        (made("half_mask", "half_p3", P3), GB),
        (made("half_mask", "half_gas_p3", A_P3), GB),
    ],
    ids=lambda one: getattr(one, "respirator_class", ""),
)
def test_parts_that_belong_together_have_nothing_against_them(assembly, pack):
    assert misfits(assembly, pack) == []


@pytest.mark.parametrize(
    ("assembly", "pack", "field", "says"),
    [
        (
            made("half_mask", "apr_full", P100),
            US,
            "respirator_class",
            "full facepiece, air-purifying is not allowed for Alder, a half mask; it may be half",
        ),
        (made("half_mask", "nothing", P100), US, "respirator_class", "nothing is not known"),
        (made("half_mask", "apr_half"), US, "element", "none; half mask, air-purifying"),
        (
            made("full_facepiece", "scba_pd_full", P100),
            US,
            "element",
            "carries its own air",
        ),
        (made("half_mask", "half_p3", P2), GB, "element", r"Filter D (P2) is not allowed"),
        (made("half_mask", "half_p3", A_P3), GB, "element", r"holds with P3"),
        (made("half_mask", "half_p3", P100), GB, "element", "P100 is not a type of Great Britain"),
        (
            made("half_mask", "apr_half", P100, maker_evidence="study"),
            US,
            "maker_evidence",
            "has no higher factor",
        ),
        (
            made("half_mask", "apr_half", P100, service_life_min=30),
            US,
            "service_life_min",
            "carries no air of its own",
        ),
    ],
    ids=lambda one: one if isinstance(one, str) else "",
)
def test_parts_that_do_not_belong_together_are_named(assembly, pack, field, says):
    assert any(one.field == field and says in one.says for one in misfits(assembly, pack))


# 29 CFR 1910.134(d)(3)(i)(A), Table 1 and its note 4. (verified)
TABLE_1 = [
    ("half_mask", "apr_half", "", 10),
    ("full_facepiece", "apr_full", "", 50),
    ("helmet_or_hood", "papr_hood", "", 25),
    ("helmet_or_hood", "papr_hood", "maker's study", 1000),
    ("helmet_or_hood", "papr_hood", "   ", 25),
    ("full_facepiece", "scba_pd_full", "", 10000),
]


@pytest.mark.parametrize(("kind", "respirator_class", "evidence", "factor"), TABLE_1)
def test_the_factor_is_that_of_the_table(kind, respirator_class, evidence, factor):
    assembly = made(kind, respirator_class, maker_evidence=evidence)
    assert assigned_factor(assembly, US) == factor


def test_a_class_of_another_pack_has_no_factor():
    assert assigned_factor(made("half_mask", "half_p3", P3), US) is None


def test_an_element_is_named_by_what_it_holds_back():
    assert [parts_of(one) for one in (P100, OV, A_P3)] == ["P100", "gas", "gas+P3"]

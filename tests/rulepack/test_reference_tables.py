"""The shipped agents, limits and particle sizes hold together and fit the rule packs."""

import csv
import math
import re
from collections import Counter

import pytest

from programme.rulepack.load import RULES, available, load

FIXTURES = RULES.parent
TABLES = ["agents", "limits", "size_distributions"]
SURE = {"verified", "computed", "memory"}


def _table(name):
    with (FIXTURES / f"{name}.csv").open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


AGENTS, LIMITS, SIZES = (_table(name) for name in TABLES)


def _has_valid_check_digit(cas):
    """CAS registry numbers: last digit = sum of digit x place from the right, modulo 10."""
    if not re.fullmatch(r"[1-9][0-9]{1,6}-[0-9]{2}-[0-9]", cas):
        return False
    *digits, check = (int(one) for one in cas.replace("-", ""))
    places = range(len(digits), 0, -1)
    return sum(d * p for d, p in zip(digits, places, strict=True)) % 10 == check


# Water, CAS 7732-18-5: 8*1 + 1*2 + 2*3 + 3*4 + 7*5 + 7*6 = 105, check digit 5 (worked by the rule
# of the registry; common knowledge of the trade)
def test_the_check_digit_rule_holds_for_water():
    assert _has_valid_check_digit("7732-18-5")
    assert not _has_valid_check_digit("7732-18-4")


@pytest.mark.parametrize("name", TABLES)
def test_every_row_has_a_source_and_a_mark(name):
    assert [
        row for row in _table(name) if not row["source"].strip() or row["sure"] not in SURE
    ] == []


def test_agents_have_a_valid_registry_number_or_say_that_they_have_none():
    bad = [
        row["cas"]
        for row in AGENTS
        if not row["cas"].startswith("NOCAS-") and not _has_valid_check_digit(row["cas"])
    ]
    assert bad == []


@pytest.mark.parametrize("column", ["cas", "name"])
def test_no_agent_stands_twice(column):
    assert [key for key, n in Counter(row[column] for row in AGENTS).items() if n > 1] == []


def test_every_limit_belongs_to_an_agent():
    assert {row["cas"] for row in LIMITS} <= {row["cas"] for row in AGENTS}


@pytest.mark.parametrize(
    ("column", "legal"),
    [
        ("unit", {"mg/m3", "ug/m3", "ppm", "f/cm3"}),
        ("kind", {"TWA", "STEL", "C"}),
        ("fraction", {"total", "inhalable", "thoracic", "respirable", "vapour"}),
    ],
)
def test_limits_speak_in_legal_words(column, legal):
    assert {row[column] for row in LIMITS} <= legal


def test_limits_are_positive_numbers_over_a_day_at_most():
    assert all(0 < float(row["value"]) < math.inf for row in LIMITS)
    assert all(0 <= int(row["averaging_min"]) <= 600 for row in LIMITS)


def test_fibre_counts_are_for_fibres_only():
    fibres = {row["cas"] for row in AGENTS if row["kind"] == "fibre"}
    assert {row["cas"] for row in LIMITS if row["unit"] == "f/cm3"} <= fibres


def test_every_limit_list_is_known_to_a_rule_pack():
    packs = [load(info.name) for info in available()]
    known = {one for pack in packs for one in (*pack.limit_lists, *pack.adoptable_limit_lists)}
    assert {row["jurisdiction"] for row in LIMITS} == known


@pytest.mark.parametrize(
    ("pack_name", "column"), [("us-2026-1", "us_filter_class"), ("gb-2026-1", "en_filter_type")]
)
def test_every_filter_need_of_an_agent_is_known_to_the_pack(pack_name, column):
    pack = load(pack_name)
    assert all(pack.needs(row[column]) for row in AGENTS)


@pytest.mark.parametrize(
    ("pack_name", "column"), [("us-2026-1", "us_filter_class"), ("gb-2026-1", "en_filter_type")]
)
def test_every_gas_need_of_an_agent_has_an_element(pack_name, column):
    pack = load(pack_name)
    for row in AGENTS:
        needs = [code for code in pack.needs(row[column]) if code in pack.gas_needs]
        assert not needs or pack.gas_elements_for(needs, cas=row["cas"]), row["name"]


@pytest.mark.parametrize("pack_name", ["us-2026-1", "gb-2026-1"])
def test_every_number_in_a_rule_pack_has_a_valid_check_digit(pack_name):
    pack = load(pack_name)
    numbers = [cas for row in (*pack.substances, *pack.not_for_cartridge) for cas in row.cas]
    numbers += [cas for row in pack.gas_elements for cas in row.agents]
    numbers += [row.cas for row in pack.max_use if row.cas]
    assert [cas for cas in numbers if not _has_valid_check_digit(cas)] == []


def test_particle_sizes_are_physical():
    assert all(0 < float(row["mmad_um"]) < 1000 for row in SIZES)
    assert all(1 <= float(row["gsd"]) < 20 for row in SIZES if row["gsd"])
    assert {row["metric"] for row in SIZES} >= {"MMAD"}

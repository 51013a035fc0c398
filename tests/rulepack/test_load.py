"""A file that is not a proper rule pack is refused, with place, value and what is allowed."""

import pytest
import yaml

from programme.rulepack.load import RULES, RulePackError, load, parse

TEXT = (RULES / "us-2026-1.yaml").read_text(encoding="utf-8")


@pytest.fixture
def written():
    return yaml.safe_load(TEXT)


def _parse(written):
    return parse(yaml.safe_dump(written), name="us-2026-1")


def test_the_shipped_file_is_read(written):
    assert _parse(written) == load("us-2026-1")


def test_a_pack_is_read_once():
    assert load("us-2026-1") is load("us-2026-1")


def test_an_unknown_pack_is_refused_with_those_there_are():
    with pytest.raises(ValueError, match=r"^rule pack: 'zz-1'; .*gb-2026-1, us-2026-1"):
        load("zz-1")


def test_no_path_is_taken_for_a_name():
    with pytest.raises(ValueError, match=r"^rule pack: '\.\./rules/us-2026-1'"):
        load("../rules/us-2026-1")


@pytest.mark.parametrize("key", ["sure", "source"])
def test_a_row_without_its_mark_or_source_is_refused(written, key):
    del written["classes"][1][key]
    message = rf"^us-2026-1\.classes\[apr_half\]\.{key}: missing"
    with pytest.raises(RulePackError, match=message):
        _parse(written)


def test_an_unknown_mark_is_refused(written):
    written["clauses"][0]["sure"] = "certain"
    message = r"clauses\[exposure-unknown\]\.sure: 'certain'; .*verified, computed, memory"
    with pytest.raises(RulePackError, match=message):
        _parse(written)


def test_an_unknown_key_is_refused_with_the_known_ones(written):
    written["classes"][0]["afp"] = 5
    message = r"^us-2026-1\.classes\[apr_quarter\]\.afp: 5; keys are source, sure"
    with pytest.raises(RulePackError, match=message):
        _parse(written)


def test_an_unknown_chapter_is_refused(written):
    written["colours"] = []
    with pytest.raises(RulePackError, match=r"^us-2026-1\.colours: \[\]; keys are name, id"):
        _parse(written)


@pytest.mark.parametrize(
    ("value", "message"),
    [
        ("10", r"apf: '10'; it must be an int"),
        (True, r"apf: True; it must be an int"),
        (10.5, r"apf: 10\.5; it must be an int"),
        (0, r"apf: 0; it must be 1 or more"),
        (None, r"apf: None; it must be an int"),
    ],
)
def test_a_factor_has_to_be_a_whole_number_from_1(written, value, message):
    written["classes"][0]["apf"] = value
    with pytest.raises(RulePackError, match=message):
        _parse(written)


@pytest.mark.parametrize("value", [float("nan"), float("inf"), 95, 0])
def test_an_efficiency_lies_between_0_and_1(written, value):
    written["particulate_filters"][0]["efficiency_min"] = value
    with pytest.raises(RulePackError, match=r"particulate_filters\[N95\]\.efficiency_min: "):
        _parse(written)


@pytest.mark.parametrize(
    ("chapter", "key", "value", "message"),
    [
        ("classes", "family", "balloon", r"family: 'balloon'; it must be one of air_purifying"),
        ("classes", "inlet", "snorkel", r"inlet: 'snorkel'; it must be one of filtering_facepiece"),
        ("classes", "elements", ["P7"], r"elements: 'P7'; it must be one of gas, N95"),
        ("particulate_filters", "oil", False, r"oil: False; it must be a str"),
        ("gas_elements", "covers", ["ZZ"], r"covers: 'ZZ'; it must be one of OV"),
        ("max_use", "elements", ["ZZ"], r"elements: 'ZZ'; it must be one of OV"),
        ("protocols", "applies_to", ["suit"], r"applies_to\[0\]: 'suit'; it must be one of"),
        ("protocols", "exercises", "all", r"exercises: 'all'; it must be a list"),
        ("pass_levels", "min_fit_factor", None, r"min_fit_factor: None; a quantitative test"),
        ("clauses", "source", "", r"source: ''; it must not be empty"),
    ],
)
def test_a_value_that_is_not_allowed_is_named(written, chapter, key, value, message):
    written[chapter][0][key] = value
    with pytest.raises(RulePackError, match=message):
        _parse(written)


@pytest.mark.parametrize(
    "chapter", ["classes", "protocols", "clauses", "substances", "pass_levels"]
)
def test_nothing_stands_twice(written, chapter):
    written[chapter].append(written[chapter][0])
    with pytest.raises(RulePackError, match="it must stand once only"):
        _parse(written)


def test_a_file_is_named_after_its_edition(written):
    written["edition"] = "2027-1"
    with pytest.raises(RulePackError, match=r"^us-2026-1\.edition: '2027-1'; a file is named"):
        _parse(written)


@pytest.mark.parametrize("text", ["", "- 1", "just words"])
def test_a_file_that_is_no_mapping_is_refused(text):
    with pytest.raises(RulePackError, match=r"^us-2026-1: .*; a rule pack is a mapping"):
        parse(text, name="us-2026-1")


def test_a_file_that_is_not_yaml_is_refused():
    with pytest.raises(RulePackError, match=r"^us-2026-1: not readable as YAML"):
        parse("id: [", name="us-2026-1")

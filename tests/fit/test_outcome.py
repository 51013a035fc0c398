"""What the figures of a fit test come to."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from programme.fit.outcome import (
    disagreement,
    fingerprint_of,
    judge_exercises,
    judge_qualitative,
    slots_of,
)
from programme.rulepack.rows import Exercise, PassLevel, Protocol
from tests.builders import DAY


def make_protocol(*counted, readings=1):
    exercises = tuple(
        Exercise(id=f"e{n}", name=f"Exercise {n}", seconds=60, counted=one, readings=readings)
        for n, one in enumerate(counted, start=1)
    )
    return Protocol(
        id="invented",
        name="Invented",
        method="quantitative",
        applies_to=("half_mask",),
        exercises=exercises,
        source="invented for a test",
        sure="memory",
    )


def make_level(least=100.0, *, each=False):
    return PassLevel(
        facepiece="half_mask",
        method="quantitative",
        allowed=True,
        min_fit_factor=least,
        each_exercise_must_pass=each,
        source="invented for a test",
        sure="memory",
    )


def test_a_bad_exercise_outweighs_a_good_one():
    judged = judge_exercises(make_protocol(True, True), [50.0, 10_000.0], make_level())
    assert judged.overall == pytest.approx(2 / (1 / 50 + 1 / 10_000))
    assert judged.outcome == "failed"


@pytest.mark.parametrize(
    ("figures", "outcome"),
    [([100.0, 100.0], "passed"), ([99.99, 100.0], "failed"), ([100.01, 100.0], "passed")],
    ids=["just at the level", "a hair below", "a hair above"],
)
def test_the_pass_level_itself_passes(figures, outcome):
    assert judge_exercises(make_protocol(True, True), figures, make_level()).outcome == outcome


def test_a_factor_just_below_the_level_is_never_shown_as_the_level():
    judged = judge_exercises(make_protocol(True), [99.999], make_level())
    assert judged.says == "Failed, 99.9 against 100."


def test_every_exercise_must_reach_the_level_where_the_pack_says_so():
    figures = [90.0, 1000.0, 1000.0]
    protocol = make_protocol(True, True, True)
    assert judge_exercises(protocol, figures, make_level()).outcome == "passed"
    strict = judge_exercises(protocol, figures, make_level(each=True))
    assert strict.outcome == "failed"
    assert "Exercise 1 reached 90" in strict.says


def test_a_missing_counted_figure_is_incomplete_however_good_the_others():
    judged = judge_exercises(make_protocol(True, True), [5000.0, None], make_level())
    assert (judged.outcome, judged.overall) == ("incomplete", None)
    assert "Exercise 2" in judged.says


def test_an_exercise_that_does_not_count_may_be_missing_or_bad():
    protocol = make_protocol(True, False, True)
    without = judge_exercises(protocol, [200.0, None, 200.0], make_level())
    bad = judge_exercises(protocol, [200.0, 1.0, 200.0], make_level(each=True))
    assert without.overall == bad.overall == pytest.approx(200)
    assert without.outcome == bad.outcome == "passed"


def test_an_exercise_read_twice_has_two_figures():
    assert [slot.key for slot in slots_of(make_protocol(True, readings=2))] == ["ff_1_1", "ff_1_2"]


def test_an_exercise_without_a_reading_has_no_figure():
    assert slots_of(make_protocol(False, readings=0)) == ()


@pytest.mark.parametrize("figure", [0.0, -5.0, 0.99, 1.1e9, math.nan, math.inf])
def test_a_figure_that_is_no_fit_factor_is_refused(figure):
    with pytest.raises(ValueError, match=r"^Exercise 1: .* is not allowed; 1 to 1 000 000 000"):
        judge_exercises(make_protocol(True), [figure], make_level())


def test_too_few_figures_are_refused():
    with pytest.raises(ValueError, match=r"^fit_factors: 1 given; Invented has 2 figures"):
        judge_exercises(make_protocol(True, True), [200.0], make_level())


@pytest.mark.parametrize(
    ("seen", "outcome"), [(True, "passed"), (False, "failed"), (None, "incomplete")]
)
def test_a_qualitative_test_has_an_outcome_and_no_figure(seen, outcome):
    judged = judge_qualitative(is_passed=seen)
    assert (judged.outcome, judged.overall) == (outcome, None)


def test_a_reported_arithmetic_mean_is_named_as_what_it_is():
    judged = judge_exercises(make_protocol(True, True), [100.0, 300.0], make_level())
    assert "arithmetic mean" in disagreement(200.0, judged, [100.0, 300.0])


def test_a_reported_figure_that_was_only_rounded_agrees():
    judged = judge_exercises(make_protocol(True), [137.93], make_level())
    assert disagreement(138.0, judged, [137.93]) == ""


figures = st.lists(st.floats(1, 1e9), min_size=1, max_size=9)


@given(figures)
def test_the_overall_figure_lies_between_the_lowest_and_the_arithmetic_mean(values):
    judged = judge_exercises(make_protocol(*[True] * len(values)), values, make_level())
    tolerance = 1 + 1e-9
    assert min(values) / tolerance <= judged.overall <= sum(values) / len(values) * tolerance


@given(figures)
def test_a_pass_is_never_given_below_the_level(values):
    judged = judge_exercises(make_protocol(*[True] * len(values)), values, make_level(500))
    assert judged.is_passed == (judged.overall >= 500)


def test_the_same_figures_have_the_same_fingerprint_and_others_another():
    def of(factors):
        return fingerprint_of(
            size_id=1, tested_on=DAY, protocol="p", fit_factors=factors, outcome="passed"
        )

    assert of([100, 200.0]) == of([100.0, 200.0])
    assert of([100.0, 200.0]) != of([100.0, None])

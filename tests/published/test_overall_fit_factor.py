"""Overall fit factor of a test against the formula of the regulation, worked by hand."""

from fractions import Fraction

import pytest

from programme.fit.outcome import judge_exercises
from tests.fit.test_outcome import make_level, make_protocol

# 29 CFR 1910.134 App. A, I.A.14 (eight exercises, the grimace third from last), I.C.2(b)(8) and
# I.C.7(d): overall = N / (1/FF1 + ... + 1/FFN), the grimace left out (verified). The exercise
# figures are chosen; 137.9 follows from the formula (computed).
FIGURES = [200.0, 150.0, 90.0, 180.0, 120.0, None, 110.0, 200.0]
COUNTED = [True, True, True, True, True, False, True, True]
PRINTED = 137.9
# 29 CFR 1910.134(f)(7) (verified).
HALF_MASK, FULL_FACEPIECE = 100, 500


def test_the_overall_fit_factor_equals_the_worked_example():
    judged = judge_exercises(make_protocol(*COUNTED), FIGURES, make_level(HALF_MASK))
    assert judged.overall == pytest.approx(PRINTED, abs=0.05)
    assert judged.outcome == "passed"
    assert judged.lowest == 90


def test_the_worked_example_fails_as_a_full_facepiece():
    judged = judge_exercises(make_protocol(*COUNTED), FIGURES, make_level(FULL_FACEPIECE))
    assert judged.outcome == "failed"


def test_the_overall_fit_factor_equals_exact_fractions():
    exact = Fraction(7) / sum(Fraction(1, int(one)) for one in FIGURES if one is not None)
    judged = judge_exercises(make_protocol(*COUNTED), FIGURES, make_level(HALF_MASK))
    assert judged.overall == pytest.approx(float(exact), rel=1e-14)


def test_a_grimace_that_breaks_the_seal_does_not_enter_the_average():
    with_grimace = [one if one is not None else 5.0 for one in FIGURES]
    judged = judge_exercises(make_protocol(*COUNTED), with_grimace, make_level(HALF_MASK))
    assert judged.overall == pytest.approx(PRINTED, abs=0.05)

import numpy as np
import pytest

from exposure.statistics.compliance import (
    compliance_chance,
    en689_group,
    en689_preliminary,
    preliminary_pass_chance,
    samples_needed,
)
from tests.exposure_statistics.groups import WELDING_FUME, batch_of

# Fewest results for a chance of 80 %: GSD, X95 over the limit, at 95 % and at 70 % confidence
# (computed from the noncentral t).
NEEDED = [
    (1.5, 0.1, 4, 3),
    (1.5, 0.75, 40, 12),
    (2.0, 0.25, 9, 4),
    (2.0, 0.5, 23, 7),
    (2.5, 0.5, 36, 11),
    (3.0, 0.25, 17, 5),
    (4.0, 0.75, 371, 109),
]


@pytest.mark.parametrize(("gsd", "ratio", "n95", "n70"), NEEDED)
def test_samples_needed_equal_the_computed_table(*, gsd, ratio, n95, n70):
    assert samples_needed(gsd, ratio, conf=0.95) == n95
    assert samples_needed(gsd, ratio, conf=0.70) == n70


def test_no_number_of_samples_shows_compliance_at_the_limit():
    assert samples_needed(2.0, 1.0) is None


def test_far_below_the_limit_compliance_is_certain_and_stays_a_number():
    chance = compliance_chance([3, 30, 300], 1.2, 1e-6)
    np.testing.assert_allclose(chance, 1.0)


def test_the_chance_at_the_limit_is_what_the_confidence_leaves():
    np.testing.assert_allclose(compliance_chance([6, 60], 2.0, 1.0, conf=0.7), 0.3, rtol=1e-9)


def test_the_group_test_is_the_70_percent_limit_against_the_limit():
    found = en689_group(batch_of(WELDING_FUME, WELDING_FUME), [5.0, 3.0])
    assert found.verdict.tolist() == ["compliant", "not compliant"]


@pytest.mark.parametrize(
    "results",
    [WELDING_FUME[:5], [0.2] * 6, ["<0.1", *WELDING_FUME], []],
    ids=["five", "identical", "nondetect", "none"],
)
def test_the_group_test_leaves_what_it_cannot_judge_undecided(results):
    assert en689_group(batch_of(results), 5.0).verdict.tolist() == ["undecided"]


def test_the_group_test_without_a_limit_is_undecided():
    assert en689_group(batch_of(WELDING_FUME), np.nan).verdict.tolist() == ["undecided"]


def test_two_results_are_too_few_for_the_preliminary_test_and_one_over_the_limit_fails_it():
    assert en689_preliminary([0.01, 0.01], 1.0) == "undecided"
    assert en689_preliminary([0.01, 1.01], 1.0) == "not compliant"


def test_a_result_just_on_the_share_passes_only_where_that_is_settled():
    # 0.3 * 0.1 / 0.3 is one rounding above 0.1.
    results = [0.3 * 0.1, 0.01, 0.01]
    assert en689_preliminary(results, 0.3) == "undecided"
    assert en689_preliminary(results, 0.3, does_boundary_pass=True) == "compliant"


def test_the_preliminary_test_is_unsafe_for_a_wide_spread():
    chances = preliminary_pass_chance([2.0, 3.0, 5.0], 3)
    np.testing.assert_allclose(chances, [0.0001, 0.035, 0.20], rtol=0.05)

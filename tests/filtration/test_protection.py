import numpy as np
import pytest
from scipy.stats import lognorm

from filtration import (
    Spreading,
    effective_protection_factor,
    effective_protection_over_tasks,
    exceedance,
    inside_exposure,
    two_level_factor,
    workplace_median,
    worn_share_for,
)


def test_the_assigned_factor_is_the_fifth_percentile_of_its_distribution():
    factors = Spreading(workplace_median(50.0, gsd=2.5), gsd=2.5)
    assert factors.quantile(0.05) == pytest.approx(50.0)


def test_without_wearers_differing_two_levels_are_one():
    one = Spreading(100.0, gsd=np.exp(0.8)).quantile(0.05)
    assert two_level_factor(100.0, between_log_sd=0.0, within_log_sd=0.8) == pytest.approx(one)


def test_the_inside_is_the_ratio_of_two_lognormals():
    rng = np.random.default_rng(8)
    outside, protection = Spreading(2.0, gsd=2.5), Spreading(40.0, gsd=2.0)
    inside = inside_exposure(outside, protection=protection)
    drawn = 2.0 * 2.5 ** rng.standard_normal(400_000)
    drawn /= 40.0 * 2.0 ** rng.standard_normal(400_000)
    assert inside.mean == pytest.approx(drawn.mean(), rel=0.02)
    assert exceedance(inside, limit=0.2) == pytest.approx(np.mean(drawn > 0.2), rel=0.02)


def test_exceedance_agrees_with_the_general_library():
    share = exceedance(Spreading(0.03, gsd=2.2), limit=[0.01, 0.1])
    np.testing.assert_allclose(share, lognorm.sf([0.01, 0.1], np.log(2.2), scale=0.03))


def test_full_correlation_of_equal_spreads_leaves_no_spread():
    inside = inside_exposure(Spreading(1.0, 2.0), protection=Spreading(10.0, 2.0), correlation=1.0)
    assert inside.gsd == pytest.approx(1.0)


@pytest.mark.parametrize(("limit", "share"), [(0.5, 1.0), (1.0, 1.0), (2.0, 0.0)])
def test_a_constant_is_over_its_limit_or_not_and_at_it_counts_as_over(limit, share):
    assert exceedance(Spreading(1.0, 1.0), limit=limit) == share


def test_a_device_never_worn_protects_nobody():
    assert effective_protection_factor(1000.0, worn_share=0.0) == 1.0


def test_periods_are_weighted_by_exposure_not_by_the_clock():
    factor = effective_protection_over_tasks(
        [50.0, 1.0], concentration=[1.0, 10.0], hours=[7.5, 0.5]
    )
    plain = effective_protection_factor(50.0, worn_share=7.5 / 8.0)
    assert factor < plain
    same = effective_protection_over_tasks([50.0, 1.0], concentration=1.0, hours=[7.5, 0.5])
    assert same == pytest.approx(plain)


def test_no_exposure_has_no_factor():
    with pytest.raises(ValueError, match=r"^exposure of all periods: 0 "):
        effective_protection_over_tasks([50.0], concentration=[0.0], hours=[8.0])


def test_the_share_to_wear_gives_back_the_factor_kept():
    worn = worn_share_for([10.0, 50.0, 1000.0], kept=0.9)
    np.testing.assert_allclose(
        effective_protection_factor([10.0, 50.0, 1000.0], worn_share=worn), [9.0, 45.0, 900.0]
    )


def test_a_factor_below_one_is_refused():
    with pytest.raises(ValueError, match=r"^factor: 0\.5 is not allowed; it must be 1 or more$"):
        effective_protection_factor(0.5, worn_share=0.9)

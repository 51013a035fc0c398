import numpy as np
import pytest
from scipy import stats

from exposure.statistics.goodness import goodness_of_fit
from exposure.statistics.lognormal import exceedance, k_factor, land, summary, utl
from exposure.statistics.outliers import grubbs_critical, has_outlier
from tests.exposure_statistics.groups import WELDING_FUME, batch_of
from tests.published.check_rows import read_commented


def test_the_factor_falls_to_the_normal_quantile_with_many_results():
    n = np.array([2, 6, 30, 1000, 100_000])
    k = k_factor(n, p=0.95, conf=0.95)
    assert (np.diff(k) < 0.0).all()
    np.testing.assert_allclose(k[-1], 1.644854, atol=0.01)


def test_one_result_has_no_factor():
    assert np.isnan(k_factor([0, 1], p=0.95, conf=0.7)).all()


def test_the_factor_refuses_a_confidence_of_one():
    with pytest.raises(
        ValueError, match=r"^conf: 1 is not allowed; it must be above 0 and below 1"
    ):
        k_factor(6, p=0.95, conf=1.0)


def test_factors_equal_the_printed_one_sided_table():
    # Composite Materials Handbook CMH-17-1G, one-sided factors (verified); a few printed entries
    # are off the exact noncentral t by two in the third decimal.
    lines = read_commented("datasets/cmh17_one_sided_k.csv")
    n, p, conf, k = (
        np.array([float(line[key]) for line in lines])
        for key in ("n", "coverage", "confidence", "k")
    )
    np.testing.assert_allclose(k_factor(n, p=p, conf=conf), k, atol=0.0025)


def test_the_limit_is_below_the_upper_limit_exactly_when_exceedance_stays_under_five_percent():
    batch = batch_of(WELDING_FUME)
    edge = utl(batch, conf=0.95)
    np.testing.assert_allclose(exceedance(batch, edge, conf=0.95).upper, 0.05, rtol=1e-6)


def test_figures_scale_with_the_unit():
    small, large = batch_of(WELDING_FUME), batch_of([1e12 * x for x in WELDING_FUME])
    for figure in ("gm", "x95", "am_mvue"):
        a, b = getattr(summary(small), figure), getattr(summary(large), figure)
        np.testing.assert_allclose(b, 1e12 * a, rtol=1e-12)
    np.testing.assert_allclose(utl(large, conf=0.7), 1e12 * utl(small, conf=0.7), rtol=1e-12)


def test_a_group_with_a_nondetect_has_no_complete_data_figures():
    batch = batch_of([0.1, "<0.2", 0.3])
    assert np.isnan(summary(batch).gm).all()
    assert np.isnan(utl(batch, conf=0.95)).all()
    assert summary(batch).status.tolist() == [1]


def test_results_that_do_not_differ_have_no_tolerance_limit():
    assert np.isnan(utl(batch_of([0.2] * 6), conf=0.95)).all()


def test_the_limit_of_the_mean_of_a_wide_group_is_finite_or_infinite_never_small():
    batch = batch_of([0.001, 9.0, 0.02, 400.0, 0.0005, 3.0])
    assert land(batch, conf=0.95)[0] > 1e6


def test_a_missing_limit_has_no_exceedance():
    found = exceedance(batch_of(WELDING_FUME, WELDING_FUME, WELDING_FUME), [np.nan, 0.0, 5.0])
    assert np.isnan(found.point).tolist() == [True, True, False]


@pytest.mark.parametrize("n", [6, 11, 12, 50, 400])
def test_normality_test_equals_scipy(n):
    x = np.exp(np.random.default_rng(n).normal(size=n))
    for scale, y in (("ln", np.log(x)), ("raw", x)):
        ours, theirs = goodness_of_fit(batch_of(list(x)), scale=scale), stats.shapiro(y)
        np.testing.assert_allclose(ours.w, theirs.statistic, rtol=1e-7)
        np.testing.assert_allclose(ours.p, theirs.pvalue, rtol=1e-5)


def test_five_results_or_ties_only_are_not_tested():
    found = goodness_of_fit(batch_of([1.0, 2.0, 3.0, 4.0, 5.0], [0.2] * 8))
    assert np.isnan(found.w).all()
    assert np.isnan(found.p).all()


def test_one_far_result_is_an_outlier_and_even_spread_is_not():
    assert has_outlier(batch_of([0.1, 0.12, 0.09, 0.11, 0.13, 60.0], WELDING_FUME)).tolist() == [
        True,
        False,
    ]


def test_critical_deviations_equal_the_printed_table():
    # Grubbs and Beck 1972, Technometrics 14:847-854, Table I, two-sided 5 %: n 3, 10, 20 (memory).
    ours = grubbs_critical(np.array([3.0, 10.0, 20.0]), level=0.05)
    np.testing.assert_allclose(ours, [1.155, 2.290, 2.709], atol=0.0015)

import numpy as np
import pytest
from scipy.integrate import dblquad
from scipy.special import log_ndtr

from exposure.statistics.bayes import GSD_RANGE, PRIORS, Prior, posterior
from exposure.statistics.lognormal import utl
from tests.exposure_statistics.groups import WELDING_FUME, batch_of, edge_case

CENSORED = [0.3, "<0.1", "<0.2", 0.15, "<0.1"]


def test_the_reference_prior_gives_back_the_tolerance_limit():
    batch = batch_of(WELDING_FUME)
    found = posterior(batch, 5.0, prior="ref")
    np.testing.assert_allclose(
        [found.q70, found.q95], [utl(batch, conf=0.7), utl(batch, conf=0.95)]
    )


def test_nondetects_under_the_weak_prior_agree_with_plain_two_dimensional_integration():
    y, limits = np.log([0.3, 0.15]), np.log([0.1, 0.2, 0.1])
    low, high = np.log(np.log(GSD_RANGE))

    def density(mu, log_sigma):
        sigma = np.exp(log_sigma)
        log = -(((y - mu) / sigma) ** 2).sum() / 2 - y.size * log_sigma
        log += log_ndtr((limits - mu) / sigma).sum()
        return np.exp(log + PRIORS["weak"].log_density(log_sigma) + 3.0)

    edges = np.log(1e-4), np.log(100.0)
    whole = dblquad(density, low, high, *edges, epsabs=1e-7)[0]
    over = dblquad(
        density, low, high, lambda s: max(-1.6448536 * np.exp(s), edges[0]), edges[1], epsabs=1e-8
    )[0]
    found = posterior(batch_of(CENSORED), 1.0, multiples=(1.0,)).p_over[0, 0]
    np.testing.assert_allclose(found, over / whole, rtol=1e-3)


def test_the_grid_for_nondetects_joins_the_closed_form_for_complete_data():
    # A nondetect under a very high limit says nothing.
    complete = posterior(batch_of(WELDING_FUME), 5.0, prior="ref")
    gridded = posterior(batch_of([*WELDING_FUME, "<1e9"]), 5.0, prior="ref")
    np.testing.assert_allclose(gridded.q95, complete.q95, rtol=2e-3)
    np.testing.assert_allclose(gridded.p_over[0, :3], complete.p_over[0, :3], atol=1e-3)


def test_chances_fall_with_the_multiple_and_quantiles_rise():
    found = posterior(batch_of(CENSORED, WELDING_FUME, [0.31]), 1.0)
    assert (np.diff(found.p_over, axis=1) <= 1e-12).all()
    assert (found.q95 > found.q70).all()


def test_the_posterior_scales_with_results_and_limit_together():
    thousand = [f"<{1000 * float(x[1:])}" if isinstance(x, str) else 1000 * x for x in CENSORED]
    a, b = posterior(batch_of(CENSORED), 1.0), posterior(batch_of(thousand), 1000.0)
    np.testing.assert_allclose(b.q95, 1000 * a.q95, rtol=1e-6)
    np.testing.assert_allclose(b.p_over, a.p_over, rtol=1e-6, atol=1e-12)


def test_groups_without_results_or_limit_have_no_posterior():
    found = posterior(batch_of([], [0.3], [0.3, -1.0]), [1.0, np.nan, 1.0])
    assert found.status.tolist() == [1, 1, 1]
    assert np.isnan(found.q95).all()
    assert np.isnan(found.p_over).all()


def test_an_unbounded_prior_has_no_posterior_for_one_result_or_for_ties():
    found = posterior(batch_of([0.3], [0.2, 0.2, 0.2], ["<0.1"] * 5), 1.0, prior="ref")
    assert np.isnan(found.q95).all()


def test_results_far_over_the_bounds_of_the_prior_are_not_pulled_down():
    found = posterior(batch_of([50_000.0], [50_000.0, "<60000"]), 1.0)
    assert (found.q70 > 50_000.0).all()


def test_many_results_are_told_apart_from_few():
    rng = np.random.default_rng(2)
    x = np.exp(rng.normal(0.0, 0.7, 2000))
    below = ["<0.5" if value < 0.5 else value for value in x]
    found = posterior(batch_of(list(x), below), 1.0)
    np.testing.assert_allclose(found.q95, np.exp(1.645 * 0.7), rtol=0.12)
    np.testing.assert_allclose(found.q95 / found.q70, 1.04, atol=0.04)


def test_an_own_prior_may_be_given():
    tight = Prior("lognormal", gsd=(1.05, 1.5), gm=(1e-4, 100.0))
    loose = posterior(batch_of([0.31]), 1.0).q95
    assert posterior(batch_of([0.31]), 1.0, prior=tight).q95 < loose


def test_an_unknown_prior_is_refused():
    with pytest.raises(ValueError, match=r"^prior: 'firm' is not allowed; it must be one of flat"):
        posterior(batch_of([0.31]), 1.0, prior="firm")


def test_the_case_of_nothing_detected_follows_the_lower_bound_of_the_prior():
    # Why it is never a finding: the answer moves with a bound that no data touch.
    batch = batch_of(edge_case("all_censored"))
    lower = Prior("lognormal", gsd=GSD_RANGE, gm=(1e-8, 100.0))
    weak, deep = posterior(batch, 1.0), posterior(batch, 1.0, prior=lower)
    assert deep.q95[0] < 0.6 * weak.q95[0]

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import stats
from scipy.special import ndtri

from exposure.statistics.censored import METHODS, pivot, quantile_limit, tobit, x95_limit
from exposure.statistics.lognormal import utl
from exposure.statistics.pack import Batch, pack
from exposure.statistics.positions import beta_substitution, kaplan_meier, ros
from tests.exposure_statistics.groups import WELDING_FUME, batch_of, random_batch

MIXED = [0.8, "<0.5", 1.4, 0.9, "<0.5", "<1.0", 2.1, 3.0, 0.6, "<0.5"]


def test_the_fit_equals_scipy_on_censored_data():
    values = np.array([0.5, 0.5, 1.0, 0.5, 0.6, 0.8, 0.9, 1.4, 2.1, 3.0])
    below = np.arange(10) < 4
    data = stats.CensoredData(uncensored=np.log(values[~below]), left=np.log(values[below]))
    mu, sigma = stats.norm.fit(data)
    ours = tobit(pack(values, below, np.zeros(10, int), n_groups=1))
    np.testing.assert_allclose([ours.mu[0], ours.sigma[0]], [mu, sigma], rtol=1e-4)


def test_many_groups_at_once_give_what_each_gives_alone():
    batch = random_batch(np.random.default_rng(5), 60)
    together = tobit(batch).mu
    alone = [tobit(batch.rows(np.array([row]))).mu[0] for row in range(60)]
    np.testing.assert_allclose(together, alone, rtol=1e-9)


@pytest.mark.parametrize(
    "results",
    [
        pytest.param(["<0.05"] * 5, id="nothing detected"),
        pytest.param([0.2] * 6, id="one value"),
        pytest.param([0.3, "<0.3", "<0.5"], id="one detect, no limit below it"),
        pytest.param([], id="nothing"),
        pytest.param([0.1, -1.0, "<0.2"], id="bad value"),
    ],
)
def test_without_a_maximum_there_is_no_fit(results):
    fit = tobit(batch_of(results))
    assert fit.status.tolist() == [1]
    assert np.isnan(fit.mu).all()
    assert np.isnan(x95_limit(batch_of(results), conf=0.95)).all()


def test_a_limit_above_all_detects_changes_next_to_nothing():
    plain = tobit(batch_of(WELDING_FUME))
    with_one = tobit(batch_of([*WELDING_FUME, "<500"]))
    np.testing.assert_allclose(with_one.mu, plain.mu, atol=1e-6)


def test_the_calibrated_limit_is_the_tolerance_limit_when_all_is_detected():
    batch = batch_of(WELDING_FUME)
    ours = x95_limit(batch, conf=0.95, method="calibrated")
    np.testing.assert_allclose(ours, utl(batch, conf=0.95), rtol=1e-9)


def test_upper_limits_rise_with_the_confidence_and_bound_the_lower_one():
    batch = batch_of(MIXED)
    found = [x95_limit(batch, conf=conf)[0] for conf in (0.6, 0.7, 0.95, 0.99)]
    assert found == sorted(found)
    assert quantile_limit(batch, p=0.95, conf=0.95, side="lower")[0] < found[0]


@pytest.mark.parametrize("method", METHODS)
def test_the_limit_scales_with_the_unit(method):
    scaled = [f"<{1000 * float(x[1:])}" if isinstance(x, str) else 1000 * x for x in MIXED]
    lod = [0.5 if not isinstance(x, str) else float(x[1:]) for x in MIXED]
    small = _with_lods(batch_of(MIXED), np.array([lod]))
    large = _with_lods(batch_of(scaled), 1000 * np.array([lod]))
    a, b = (x95_limit(batch, conf=0.95, method=method) for batch in (small, large))
    np.testing.assert_allclose(b, 1000 * a, rtol=1e-6)


def _with_lods(batch, lod):
    return Batch(batch.values, batch.mask, batch.censored, lod)


def test_the_pivot_needs_the_detection_limit_of_detects_too():
    assert np.isnan(x95_limit(batch_of(MIXED), conf=0.95, method="pivot")).all()


def test_the_pivot_says_the_same_twice_and_how_much_it_left_out():
    lod = np.array([[0.5, 0.5, 0.5, 0.5, 0.5, 1.0, 0.5, 0.5, 0.5, 0.5]])
    batch = _with_lods(batch_of(MIXED), lod)
    first, second = pivot(batch, conf=0.95, n_draws=500), pivot(batch, conf=0.95, n_draws=500)
    assert first.limit.tolist() == second.limit.tolist()
    assert 0.0 <= first.share_left_out[0] < 0.05


def test_an_unknown_method_is_refused():
    with pytest.raises(ValueError, match=r"^method: 'wald' is not allowed; it must be one of cal"):
        x95_limit(batch_of(MIXED), conf=0.95, method="wald")


@pytest.mark.parametrize(
    ("conf", "at_least", "at_most"), [(0.95, 0.935, 0.975), (0.70, 0.68, 0.76)]
)
def test_the_calibrated_limit_covers_as_often_as_it_says(conf, at_least, at_most):
    rng, sigma, n = np.random.default_rng(11), 0.9, 10
    x = np.exp(sigma * rng.standard_normal((2000, n)))
    lod = np.exp(sigma * ndtri(rng.choice([0.3, 0.4, 0.5], x.shape)))
    below = x < lod
    batch = Batch(np.where(below, lod, x), np.ones_like(below), below, lod)
    is_told = (~below).sum(axis=1) >= 3
    limit = x95_limit(batch, conf=conf, method="calibrated")[is_told]
    assert at_least <= (limit >= np.exp(1.644854 * sigma)).mean() <= at_most


values_strategy = st.lists(
    st.tuples(st.floats(0.01, 100.0), st.booleans()), min_size=1, max_size=12
)


@settings(deadline=None)
@given(values_strategy, st.floats(1e-6, 1e6))
def test_a_fit_exists_for_both_units_or_for_neither_and_shifts_with_the_unit(results, factor):
    values = np.array([value for value, _ in results])
    below = np.array([flag for _, flag in results])
    group = np.zeros(values.size, int)
    a, b = (tobit(pack(v, below, group, n_groups=1)) for v in (values, factor * values))
    assert a.status.tolist() == b.status.tolist()
    if a.status[0] == 0:
        np.testing.assert_allclose(b.sigma, a.sigma, rtol=1e-4)
        np.testing.assert_allclose(b.mu - a.mu, np.log(factor), atol=1e-4 * (1 + a.sigma[0]))


@settings(deadline=None)
@given(values_strategy)
def test_the_upper_limit_is_never_below_the_estimate(results):
    values = np.array([value for value, _ in results])
    below = np.array([flag for _, flag in results])
    batch = pack(values, below, np.zeros(values.size, int), n_groups=1)
    fit = tobit(batch)
    low, high = (x95_limit(batch, conf=c, method="calibrated")[0] for c in (0.7, 0.95))
    if fit.status[0] == 0 and np.isfinite(high):
        assert low >= np.exp(fit.mu[0] + 1.6448 * fit.sigma[0]) * (1 - 1e-9)
        assert high >= low


def test_ros_leaves_detects_as_they_are_and_puts_nondetects_lower():
    values, below = np.array([1.0, 2.0, 4.0, 8.0, 1.0]), np.array([0, 0, 0, 0, 1], bool)
    done = ros(values, below).completed
    assert done[:4].tolist() == values[:4].tolist()
    assert done[4] < 1.5


def test_ros_refuses_a_single_detect():
    with pytest.raises(ValueError, match=r"^values: 1 detects are not allowed; at least 2"):
        ros([1.0, 0.5], [False, True])


def test_kaplan_meier_of_complete_data_is_their_mean():
    np.testing.assert_allclose(kaplan_meier([1.0, 2.0, 6.0], [0, 0, 0]).mean, 3.0)


def test_kaplan_meier_refuses_a_group_without_a_detect():
    with pytest.raises(ValueError, match=r"^values: no detect"):
        kaplan_meier([1.0], [True])


def test_beta_substitution_is_for_groups_with_both_kinds_of_result():
    found = beta_substitution(batch_of([1.0, 2.0], ["<1"], [1.0, 3.0, "<1"]))
    assert np.isfinite(found.x95).tolist() == [False, False, True]

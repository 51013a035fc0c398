import numpy as np
import pytest

from exposure.statistics.variance import (
    components,
    equivalent_n,
    individual_chance,
    likelihood_components,
    var_between_of_range,
    worker_mean_over_limit,
    worker_range,
)
from tests.published.check_rows import read_commented

LINES = read_commented("datasets/dyestuff_batches.csv")
YIELD = np.array([float(line["value"]) for line in LINES])
BATCH = [line["group"] for line in LINES]


def test_balanced_groups_give_the_published_components():
    # Davies and Goldsmith 1972, section 6.4; figures recalled (memory).
    found = components(YIELD, BATCH)
    np.testing.assert_allclose([found.var_between, found.var_within], [1764.05, 2451.25], rtol=1e-6)


def test_restricted_likelihood_equals_the_analysis_of_variance_in_balanced_groups():
    anova, reml = components(YIELD, BATCH), likelihood_components(YIELD, BATCH)
    np.testing.assert_allclose(reml.var_between, anova.var_between, rtol=1e-5)
    np.testing.assert_allclose(reml.var_within, anova.var_within, rtol=1e-5)


def test_workers_that_differ_less_than_their_days_have_no_variance_between():
    y, worker = [0.0, 2.0, 0.1, 2.1, -0.1, 1.9], ["a", "a", "b", "b", "c", "c"]
    found = components(y, worker)
    assert found.is_truncated
    assert found.var_between == 0.0
    assert likelihood_components(y, worker).var_between == 0.0


@pytest.mark.parametrize(
    "worker", [["a", "a", "b", "b"], ["a", "b", "c", "d"]], ids=["two workers", "no repeat"]
)
def test_two_workers_or_no_repeat_are_not_estimable(worker):
    assert components([1.0, 2.0, 3.0, 5.0], worker) is None
    assert likelihood_components([1.0, 2.0, 3.0, 5.0], worker) is None


def test_labels_must_be_as_many_as_results():
    with pytest.raises(
        ValueError, match=r"^worker: shape \(2,\) is not allowed; it must be \(3,\)"
    ):
        components([1.0, 2.0, 3.0], ["a", "b"])


def test_range_and_variance_are_inverse():
    np.testing.assert_allclose(worker_range(var_between_of_range([1.5, 2.0, 15.0])), [1.5, 2, 15])


def test_the_equivalent_number_lies_between_workers_and_results():
    found = equivalent_n(20, 5, share_between=np.array([0.0, 0.4, 1.0]))
    assert found[0] == 20.0
    assert 5.0 < found[1] < 20.0
    assert found[2] == 5.0


def test_a_higher_limit_is_exceeded_by_fewer_workers():
    chances = worker_mean_over_limit(0.0, 0.3, var_within=0.5, limit=np.array([1.0, 2.0, 4.0]))
    assert (np.diff(chances) < 0.0).all()


def test_half_of_the_workers_fail_where_the_middle_one_has_five_percent_of_days_over():
    chance = individual_chance(0.0, 0.2, var_within=1.0, limit=np.exp(1.6448536))
    np.testing.assert_allclose(chance, 0.5, atol=1e-6)

"""What enters the hazard ratio, and every dangerous case with its answer."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from exposure.statistics.bayes import posterior
from exposure.statistics.decisions import all_below_bound, describe
from exposure.statistics.flags import SENTENCES
from exposure.statistics.lognormal import summary, utl
from exposure.statistics.pack import pack
from tests.exposure_statistics.groups import WELDING_FUME, batch_of, edge_case, random_batch

FIGURES = ("gm", "gsd", "x95", "x95_upper70", "x95_upper95", "governing", "ratio", "ratio95")


def described(results, limit=1.0, **more):
    return describe(batch_of(results), limit, **more)


def test_six_results_are_governed_by_the_70_percent_limit_and_95_stands_beside():
    found = described(WELDING_FUME, 5.0)
    assert found.basis[0] == "lognormal"
    np.testing.assert_allclose(found.governing, utl(batch_of(WELDING_FUME), conf=0.70))
    np.testing.assert_allclose(found.ratio95, utl(batch_of(WELDING_FUME), conf=0.95) / 5.0)


def test_the_stricter_policy_lets_the_95_percent_limit_govern():
    found = described(WELDING_FUME, 5.0, policy="upper95")
    assert found.ratio[0] == found.ratio95[0]


@pytest.mark.parametrize("policy", ["x95", "mean", "upper50"])
def test_a_looser_policy_is_refused(policy):
    with pytest.raises(
        ValueError, match=r"^policy: .* is not allowed; it must be one of upper70, "
    ):
        described(WELDING_FUME, 5.0, policy=policy)


def test_the_statistic_is_never_below_the_highest_result():
    found = described([0.1, 0.11, 0.1, 0.12, 0.1, 0.11, 0.1, 0.1, 0.12, 0.1, 0.11, 0.1, 0.9])
    assert found.governing[0] >= 0.9


def test_limits_may_differ_by_group_and_must_fit_them():
    batch = batch_of(WELDING_FUME, WELDING_FUME)
    found = describe(batch, [5.0, 50.0])
    np.testing.assert_allclose(found.ratio[0], 10.0 * found.ratio[1])
    with pytest.raises(ValueError, match=r"^limit: shape \(3,\) is not allowed; it must be one or"):
        describe(batch, [1.0, 2.0, 3.0])


@pytest.mark.parametrize("limit", [np.nan, 0.0, -1.0, np.inf], ids=str)
def test_a_missing_or_senseless_limit_gives_no_figure(limit):
    found = described(WELDING_FUME, limit)
    assert found.status.tolist() == [1]
    assert all(np.isnan(getattr(found, name)).all() for name in FIGURES)
    assert found.flags == [("limit_missing",)]


def test_no_results_give_no_estimate():
    found = described([])
    assert (found.status[0], found.basis[0], found.flags[0]) == (1, "none", ("no_results",))
    assert np.isnan(found.ratio[0])


@pytest.mark.parametrize("case", ["has_zero", "has_negative"])
def test_zero_or_negative_results_are_not_numbers(case):
    found = described(edge_case(case))
    assert (found.status[0], found.flags[0]) == (1, ("bad_value",))
    assert all(np.isnan(getattr(found, name)).all() for name in (*FIGURES, "highest"))


def test_a_nondetect_without_its_limit_holds_its_group():
    batch = pack([0.1, 0.2], [True, False], [0, 0], n_groups=1, lod=[np.nan, 0.01])
    assert describe(batch, 1.0).status.tolist() == [1]


def test_a_bad_group_changes_no_other():
    alone = described(WELDING_FUME, 5.0)
    among = describe(batch_of([np.nan, 1.0], WELDING_FUME, [], [0.0] * 40), 5.0)
    assert among.status.tolist() == [1, 0, 1, 1]
    for name in FIGURES:
        assert getattr(among, name)[1] == getattr(alone, name)[0]


def test_nothing_detected_gives_the_reach_of_the_method_and_no_estimate_of_gm():
    found = described(edge_case("all_censored"))
    assert found.basis[0] == "all below detection"
    assert np.isnan([found.gm[0], found.gsd[0], found.x95[0], found.highest[0]]).all()
    np.testing.assert_allclose(found.governing, 0.05 * all_below_bound(1.0, 5))
    # Five results: 3.4 times the limit of detection.
    np.testing.assert_allclose(found.governing / 0.05, 3.4, atol=0.05)


def test_nothing_detected_is_bounded_at_95_percent_under_either_policy():
    cases = [described(["<0.05"] * 5, policy=policy) for policy in ("upper70", "upper95")]
    assert cases[0].governing[0] == cases[1].governing[0] == cases[0].x95_upper95[0]


def test_many_results_below_detection_do_not_push_the_bound_under_the_detection_limit():
    assert described(["<0.05"] * 300).governing[0] == 0.05


def test_a_single_nondetect_is_bounded_at_fourteen_times_its_limit():
    found = described(edge_case("single_nondetect"))
    np.testing.assert_allclose(found.governing / 0.02, 13.9, atol=0.05)


def test_a_single_result_cannot_support_a_low_class():
    found = described(edge_case("single_result"))
    assert found.basis[0] == "few results"
    np.testing.assert_allclose(found.governing / 0.31, 5.84, atol=0.02)
    np.testing.assert_allclose(found.x95_upper95 / 0.31, 52.8, atol=0.3)
    assert np.isnan(found.gsd[0])
    assert "n_lt_6" in found.flags[0]


def test_two_results_are_decided_by_the_prior_not_by_the_tolerance_limit():
    batch = batch_of(edge_case("two_results"))
    found = describe(batch, 1.0)
    assert found.governing[0] == posterior(batch, 1.0).q70[0]
    assert found.x95_upper95[0] < utl(batch, conf=0.95)[0]


def test_two_results_that_scatter_beyond_the_prior_keep_their_plain_estimate_as_floor():
    found = described([0.0001, 1.0])
    assert found.x95_upper70[0] == found.x95[0]
    assert "prior_driven" in found.flags[0]


def test_identical_results_ask_for_the_rounding_and_get_the_prior():
    found = described(edge_case("zero_variance"))
    assert found.basis[0] == "identical results"
    np.testing.assert_allclose(found.x95_upper95, 0.309, atol=0.001)
    assert {"identical", "gsd_low"} <= set(found.flags[0])
    assert "not_lognormal" not in found.flags[0]


def test_two_coarse_values_are_flagged_and_their_limit_only_raised():
    batch = batch_of(edge_case("two_distinct_ties"))
    found = describe(batch, 1.0)
    assert "rounded" in found.flags[0]
    assert found.x95_upper70[0] >= max(utl(batch, conf=0.7)[0], posterior(batch, 1.0).q70[0])


def test_a_huge_spread_is_worked_in_logs_and_flagged():
    found = described(edge_case("huge_gsd"))
    assert {"gsd_high", "gsd_over_10"} <= set(found.flags[0])
    assert np.isfinite(found.ratio95[0])


def test_a_limit_above_all_detects_is_kept_out_of_the_highest_and_does_no_harm():
    results = edge_case("lod_above_all_detects")
    found = described(results)
    without = described([one for one in results if not isinstance(one, str)])
    assert found.highest[0] == 0.11
    assert {"lod_over_detects", "lod_over_limit"} <= set(found.flags[0])
    np.testing.assert_allclose(found.x95, without.x95, rtol=0.15)


def test_nondetects_that_tell_nothing_do_not_make_six_results_of_three():
    found = described([0.1, 0.2, 0.4, "<9", "<9", "<9"])
    assert found.basis[0] == "few results"
    plain = described([0.1, 0.2, 0.4])
    np.testing.assert_allclose(found.x95_upper70, plain.x95_upper70, rtol=0.05)


def test_one_detect_among_nondetects_has_no_point_estimate():
    found = described(edge_case("one_detect"))
    assert found.basis[0] == "few results"
    assert np.isnan([found.gm[0], found.x95[0]]).all()
    np.testing.assert_allclose(found.x95_upper95, 0.79, atol=0.005)
    assert {"few_detects", "censored_high"} <= set(found.flags[0])


def test_a_detect_below_the_limit_of_others_is_accepted_and_flagged():
    found = described(edge_case("detect_below_lod"))
    assert found.status[0] == 0
    assert "detect_under_lod" in found.flags[0]


def test_an_extreme_result_is_kept_and_flagged():
    found = described(edge_case("extreme_outlier"))
    assert found.highest[0] == 60.0
    assert {"outlier", "not_lognormal"} <= set(found.flags[0])


@pytest.mark.parametrize("case", ["huge_scale", "tiny_scale"])
def test_units_of_any_size_scale_exactly(case):
    results = edge_case(case)
    size = {"huge_scale": 1e12, "tiny_scale": 1e-12}[case]
    found, plain = described(results, size), described([x / size for x in results])
    for name in ("ratio", "ratio95", "gsd"):
        np.testing.assert_allclose(getattr(found, name), getattr(plain, name), rtol=1e-9)


def test_a_wrong_unit_is_suspected():
    assert "unit_suspect" in described([2000.0, 30000.0, 70000.0], 0.05).flags[0]


def test_readings_of_a_logger_are_not_results_of_a_group():
    found = described([0.1, 0.2, 0.3] * 2000)
    assert (found.status[0], found.flags[0]) == (1, ("too_many_results",))


def test_more_than_four_fifths_below_detection_is_not_fitted():
    found = described(["<0.1"] * 17 + [0.2, 0.3, 0.4])
    assert found.basis[0] == "few results"
    assert np.isnan(found.x95[0])


def test_three_detects_among_six_are_fitted_by_likelihood():
    found = described(["<0.1"] * 3 + [0.2, 0.3, 0.14])
    assert found.basis[0] == "maximum likelihood"
    assert found.x95_upper70[0] > found.x95[0]


def test_a_batch_gives_what_each_group_gives_alone():
    batch = random_batch(np.random.default_rng(8), 40)
    together = describe(batch, 1.0)
    for row in range(40):
        alone = describe(batch.rows(np.array([row])), 1.0)
        np.testing.assert_allclose(together.ratio[row], alone.ratio[0], rtol=1e-9)
        assert together.flags[row] == alone.flags[0]


def test_no_groups_at_all_are_described_too():
    found = describe(pack([], [], [], n_groups=0), 1.0)
    assert found.ratio.shape == (0,)
    assert found.flags == []


def test_every_flag_has_its_sentence():
    batch = random_batch(np.random.default_rng(9), 300)
    said = {word for words in describe(batch, 1.0).flags for word in words}
    assert said <= set(SENTENCES)


def test_figures_of_complete_groups_are_the_summary():
    found, plain = described([0.1, 0.4, 0.2]), summary(batch_of([0.1, 0.4, 0.2]))
    np.testing.assert_allclose([found.gm, found.gsd, found.x95], [plain.gm, plain.gsd, plain.x95])


group_strategy = st.lists(
    st.tuples(st.floats(0.001, 1000.0), st.booleans()), min_size=1, max_size=14
)


def _batch(results, factor=1.0):
    values = factor * np.array([value for value, _ in results])
    return pack(values, [flag for _, flag in results], [0] * values.size, n_groups=1)


@settings(deadline=None)
@given(group_strategy)
def test_every_sound_group_gets_a_ratio_in_order_of_confidence(results):
    found = describe(_batch(results), 1.0)
    assert found.status[0] == 0
    assert found.x95_upper95[0] >= found.x95_upper70[0]
    assert not found.x95_upper70[0] < found.x95[0]
    assert found.ratio95[0] >= found.ratio[0] > 0.0
    assert not found.governing[0] < found.highest[0]


@settings(deadline=None)
@given(group_strategy, st.sampled_from([1e-9, 1e-3, 7.0, 1e6]))
def test_results_and_limit_in_another_unit_give_the_same_ratio(results, factor):
    plain, scaled = describe(_batch(results), 1.0), describe(_batch(results, factor), factor)
    np.testing.assert_allclose(scaled.ratio, plain.ratio, rtol=1e-4)
    assert scaled.basis[0] == plain.basis[0]


@settings(deadline=None)
@given(group_strategy, st.integers(0, 13))
def test_a_higher_highest_result_never_lowers_the_governing_statistic_below_it(results, place):
    raised = list(results)
    raised[place % len(raised)] = (5000.0, False)
    assert describe(_batch(raised), 1.0).governing[0] >= 5000.0

import numpy as np
import pytest
from scipy.optimize import brentq

from filtration import (
    Seal,
    fit_factor_to_leak,
    inward_leakage,
    lung_overstatement,
    measured_fit_factor,
    overall_fit_factor,
    share_elasticities,
    solve,
)

L_MIN = 1.0 / 60_000.0
RESISTANCE = 120.0 / (85 * L_MIN)


def test_a_slit_has_the_closed_form():
    share = solve(1e-3, resistance_pa_s_m3=1e5, seal=Seal(1e-7, 1.0)).share
    np.testing.assert_allclose(share, 0.01 / 1.01, rtol=1e-13)


def test_the_flows_of_both_paths_add_up():
    seal = Seal(5e-7, [0.5, 0.6, 0.7, 1.0])
    state = solve(1e-3, resistance_pa_s_m3=1e5, seal=seal)
    through = state.pressure_pa / 1e5 + seal.leak_k * state.pressure_pa**seal.exponent
    np.testing.assert_allclose(through, 1e-3, rtol=1e-13)


def test_newton_agrees_with_a_bracketed_solve():
    def excess(pressure):
        return pressure / 1e5 + 3e-6 * pressure**0.62 - 1.4e-3

    state = solve(1.4e-3, resistance_pa_s_m3=1e5, seal=Seal(3e-6, 0.62))
    np.testing.assert_allclose(state.pressure_pa, brentq(excess, 1e-6, 1e4, xtol=1e-12), rtol=1e-11)


def test_a_tight_seal_leaves_all_pressure_to_the_filter():
    state = solve(1e-3, resistance_pa_s_m3=1e5, seal=Seal(0.0))
    np.testing.assert_allclose(state.pressure_pa, 100.0)
    assert state.share == 0.0


def test_a_valve_adds_its_quadratic_pressure():
    state = solve(1e-3, resistance_pa_s_m3=1e5, seal=Seal(0.0), valve_pa_s2_m6=2e7)
    np.testing.assert_allclose(state.pressure_pa, 120.0)


def test_a_share_is_found_again_at_its_own_flow():
    seal = Seal.from_share(0.01, flow_m3_s=85 * L_MIN, resistance_pa_s_m3=RESISTANCE)
    state = solve(85 * L_MIN, resistance_pa_s_m3=RESISTANCE, seal=seal)
    np.testing.assert_allclose(state.share, 0.01, rtol=1e-12)


def test_elasticities_equal_the_finite_difference():
    seal = Seal.from_share(0.05, flow_m3_s=1e-3, resistance_pa_s_m3=1e5, exponent=0.7)

    def log_share(flow, resistance):
        return np.log(solve(flow, resistance_pa_s_m3=resistance, seal=seal).share)

    step = 1e-4
    by_resistance = (log_share(1e-3, 1e5 * (1 + step)) - log_share(1e-3, 1e5 * (1 - step))) / (
        2 * step
    )
    by_flow = (log_share(1e-3 * (1 + step), 1e5) - log_share(1e-3 * (1 - step), 1e5)) / (2 * step)
    np.testing.assert_allclose(
        share_elasticities(0.05, exponent=0.7), [by_resistance, by_flow], rtol=1e-6
    )


def test_a_clogged_filter_leaks_more_and_hard_breathing_leaks_less():
    seal = Seal.from_share(0.01, flow_m3_s=85 * L_MIN, resistance_pa_s_m3=RESISTANCE)
    clean, clogged = solve(85 * L_MIN, resistance_pa_s_m3=RESISTANCE * np.r_[1, 3], seal=seal).share
    assert clogged > 2 * clean
    calm, hard = solve(np.r_[30, 170] * L_MIN, resistance_pa_s_m3=RESISTANCE, seal=seal).share
    assert hard < calm


def test_a_narrow_slit_follows_the_cube_of_its_height():
    size = {"length_m": 0.01, "width_m": 0.02, "viscosity_pa_s": 1.8e-5}
    one, two = (Seal.slit(height_m=height, **size).leak_k for height in (1e-4, 2e-4))
    np.testing.assert_allclose(two, 8 * one)


def test_inward_leakage_lies_between_its_two_paths():
    leakage = inward_leakage([0.0, 0.01, 1.0], filter_penetration=0.05)
    np.testing.assert_allclose(leakage, [0.05, 0.0595, 1.0])


def test_no_fit_factor_exists_where_nothing_comes_in():
    with pytest.raises(ValueError, match=r"^inward leakage: 0 is not allowed"):
        measured_fit_factor(0.0, filter_penetration=0.0)


def test_the_leak_is_found_back_from_its_fit_factor():
    measured = measured_fit_factor(0.004, filter_penetration=0.0003)
    finding = fit_factor_to_leak(measured, filter_penetration=0.0003)
    np.testing.assert_allclose(finding.share, 0.004)
    assert finding.is_resolved


def test_a_fit_factor_that_the_filter_alone_explains_is_unresolved_and_no_pass():
    finding = fit_factor_to_leak([20.0, 15.0], filter_penetration=0.05)
    assert finding.is_resolved.tolist() == [False, True]
    assert finding.share.mask.tolist() == [True, False]
    assert "not a pass" in finding.reason


def test_a_bad_exercise_outweighs_good_ones():
    assert overall_fit_factor([1000.0] * 6 + [20.0]) < 200.0


def test_equal_exercises_have_their_own_value():
    np.testing.assert_allclose(overall_fit_factor([[300.0] * 7, [100.0] * 7]), [300.0, 100.0])


def test_exercises_may_lie_along_any_axis():
    table = np.array([[100.0, 200.0], [300.0, 400.0]])
    np.testing.assert_allclose(
        overall_fit_factor(table, axis=0), overall_fit_factor(table.T, axis=1)
    )


@pytest.mark.parametrize("bad", [0.5, float("nan"), float("inf"), None], ids=str)
def test_a_fit_factor_that_cannot_be_is_refused(bad):
    with pytest.raises(ValueError, match=r"^fit_factors: .* it must be 1 or more$"):
        overall_fit_factor([100.0, bad])


def test_no_exercises_are_no_test():
    with pytest.raises(ValueError, match=r"^fit_factors: none given"):
        overall_fit_factor([])


def test_half_deposited_overstates_the_fit_factor_by_a_third():
    np.testing.assert_allclose(lung_overstatement([0.0, 0.5, 1.0]), [1.0, 4 / 3, 2.0])

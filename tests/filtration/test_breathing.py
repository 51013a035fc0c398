import numpy as np
import pytest

from filtration import (
    WORK_CLASSES,
    cycle_average,
    face_velocity_m_s,
    inspiratory_flows,
    minute_volume_from_metabolism_m3_s,
    minute_volume_m3_s,
    power_cycle_factor,
)
from filtration.breathing import METABOLIC_RATE_W_M2

L_MIN = 1.0 / 60_000.0


def test_work_classes_rise_from_rest_to_very_hard():
    assert list(WORK_CLASSES.values()) == sorted(WORK_CLASSES.values())
    assert WORK_CLASSES["resting"] == 10.0
    assert WORK_CLASSES["very_high"] == 60.0


def test_an_unknown_class_is_refused_with_the_known_ones():
    with pytest.raises(ValueError, match=r"^work_class: 'light' is not allowed; .*resting, low,"):
        minute_volume_m3_s("light")


def test_flows_rank_mean_below_flow_weighted_below_peak():
    flows = inspiratory_flows([10 * L_MIN, 30 * L_MIN])
    assert flows.mean_m3_s.shape == (2,)
    assert np.all(flows.mean_m3_s < flows.flow_weighted_m3_s)
    assert np.all(flows.flow_weighted_m3_s < flows.peak_m3_s)


def test_the_cycle_average_of_the_flow_is_the_flow_weighted_mean():
    average = cycle_average(lambda flow: flow, 30 * L_MIN)
    np.testing.assert_allclose(average, inspiratory_flows(30 * L_MIN).flow_weighted_m3_s)


def test_the_cycle_average_of_a_constant_is_the_constant():
    np.testing.assert_allclose(cycle_average(lambda flow: flow * 0 + 0.03, [1e-4, 1e-3]), 0.03)


@pytest.mark.parametrize("exponent", [0.0, 0.5, 1.0, 2.0])
def test_the_closed_form_equals_the_quadrature(exponent):
    peak = inspiratory_flows(30 * L_MIN).peak_m3_s
    average = cycle_average(lambda flow: (flow / peak) ** exponent, 30 * L_MIN)
    np.testing.assert_allclose(power_cycle_factor(exponent), average, rtol=1e-6)


def test_a_metabolic_rate_gives_about_the_minute_volume_of_its_class():
    watts = METABOLIC_RATE_W_M2["moderate"] * 1.8
    volume = minute_volume_from_metabolism_m3_s(watts) / L_MIN
    assert 0.7 * WORK_CLASSES["moderate"] < volume < 1.4 * WORK_CLASSES["moderate"]


def test_face_velocity_refuses_a_filter_without_area():
    with pytest.raises(ValueError, match=r"^area_m2: 0 is not allowed; it must be more than 0$"):
        face_velocity_m_s(1e-3, area_m2=0.0)

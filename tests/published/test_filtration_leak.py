"""Breathing and face seal against published figures."""

import math

import numpy as np
import pytest

from filtration import inspiratory_flows, overall_fit_factor, share_elasticities

L_MIN = 1.0 / 60_000.0


# Eshbaugh et al. (2009) J Occup Environ Hyg 6:52-61, abstract (verified): constant 270 and 360
# L/min stood for the mean of 135 and the peak of 115 L/min cyclic breathing.
def test_mean_and_peak_flow_pair_as_in_the_published_test_plan():
    np.testing.assert_allclose(inspiratory_flows(135 * L_MIN).mean_m3_s, 270 * L_MIN)
    np.testing.assert_allclose(inspiratory_flows(115 * L_MIN).peak_m3_s, 360 * L_MIN, rtol=5e-3)


# Cho et al. (2013) J Occup Environ Hyg 10:109-115, abstract (verified): seal penetration 0.96,
# 0.41, 0.17 % at 15, 30, 85 L/min.
CHO_FLOW = [15.0, 30.0, 85.0]
CHO_SEAL = [0.0096, 0.0041, 0.0017]


def test_seal_penetration_falls_with_flow_faster_than_a_fixed_gap_can():
    slope = np.polyfit(np.log(CHO_FLOW), np.log(CHO_SEAL), 1)[0]
    _, steepest = share_elasticities(min(CHO_SEAL), exponent=0.5)
    assert slope < steepest < 0.0
    np.testing.assert_allclose(
        math.log(CHO_SEAL[-1] / CHO_SEAL[0]) / math.log(CHO_FLOW[-1] / CHO_FLOW[0]),
        -0.998,
        atol=5e-4,
    )


# 29 CFR 1910.134 App. A, Part I.C.3 (memory of the clause): N / sum of 1/FF.
@pytest.mark.parametrize(
    ("fit_factors", "overall"),
    [([1000.0] * 6 + [20.0], 125.0), ([200, 150, 300, 120, 90, 250, 180], 159.09)],
    ids=["one bad exercise", "seven exercises"],
)
def test_overall_fit_factor_is_the_harmonic_mean_of_the_rule(fit_factors, overall):
    np.testing.assert_allclose(overall_fit_factor(fit_factors), overall, rtol=1e-5)

"""Workplace protection against published studies."""

import numpy as np
import pytest
from scipy.special import ndtri

from filtration import (
    Spreading,
    effective_protection_factor,
    exceedance,
    two_level_factor,
)

# Nelson TJ (1996) AIHAJ 57:717-724, abstract (verified): 390 pooled half-mask values, 5th
# percentile 13, 1.5 % below 10.
NELSON_5TH = 13.0
NELSON_BELOW_10 = 0.015


def test_the_pooled_half_mask_figures_fit_one_lognormal_lower_tail():
    gsd = np.exp(np.log(NELSON_5TH / 10.0) / (ndtri(0.05) - ndtri(NELSON_BELOW_10)))
    factors = Spreading(NELSON_5TH / gsd ** ndtri(0.05), gsd=gsd)
    np.testing.assert_allclose(gsd, 1.648, atol=5e-4)
    np.testing.assert_allclose(factors.quantile(0.05), NELSON_5TH)
    np.testing.assert_allclose(1.0 - exceedance(factors, limit=10.0), NELSON_BELOW_10)


# Nicas M, Neuhaus J (2004) J Occup Environ Hyg 1:99-109 (criterion verified).
def test_the_two_level_criterion_is_stricter_than_the_pooled_percentile():
    between, within = 0.5, 0.8
    pooled = Spreading(100.0, gsd=np.exp(np.hypot(between, within))).quantile(0.05)
    two_level = two_level_factor(100.0, between_log_sd=between, within_log_sd=within)
    assert two_level < pooled


# Wear time, exact: half an hour off in eight; 95 % wear caps every device at 20 (common practice).
@pytest.mark.parametrize(
    ("factor", "worn", "effective"),
    [(50, 0.9375, 12.3), (1000, 0.99, 91.0), (2000, 0.95, 19.8)],
    ids=["half an hour off", "99 % of the time", "95 % of the time"],
)
def test_time_not_worn_takes_most_of_a_high_factor(factor, worn, effective):
    ours = effective_protection_factor(factor, worn_share=worn)
    np.testing.assert_allclose(ours, effective, atol=0.05)

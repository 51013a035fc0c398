import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from exposure.statistics.limits import (
    RULES,
    adjust,
    mixture_index,
    sae_limits,
    silica_limit_mg_m3,
    workers_to_sample,
)

# 29 CFR 1910.1025(c)(2): 400 divided by hours worked, ug/m3 (verified).
LEAD_UG_M3 = [(8.0, 50.0), (10.0, 40.0), (12.0, 400.0 / 12.0)]


@pytest.mark.parametrize(("hours", "printed"), LEAD_UG_M3)
def test_the_lead_limit_falls_with_the_hours(hours, printed):
    ours = adjust(50.0, "lead", hours_day=hours, hours_week=40.0)
    np.testing.assert_allclose(ours, printed)


@settings(deadline=None)
@given(st.sampled_from(sorted(RULES)), st.floats(0.5, 23.9), st.floats(0.5, 167.0))
def test_no_rule_ever_raises_a_limit(rule, day, week):
    assert 0.0 < adjust(1.0, rule, hours_day=day, hours_week=week) <= 1.0


def test_no_rule_leaves_the_limit_as_it_is():
    assert adjust(0.5, "none", hours_day=12.0, hours_week=60.0) == 0.5


def test_an_unknown_rule_is_refused():
    with pytest.raises(ValueError, match=r"^rule: 'half' is not allowed; it must be one of brief"):
        adjust(1.0, "half", hours_day=8.0, hours_week=40.0)


def test_two_samples_can_show_what_one_cannot():
    # Boss and Day, chapter 4 (verified inputs): the same average, one sample and two.
    one = sae_limits([6.07], [450.0], sae=0.23, limit=5.0)
    two = sae_limits([6.26, 5.85], [240.0, 210.0], sae=0.23, limit=5.0)
    assert one.verdict == "possibly exceeded"
    assert two.verdict == "exceeded"


@pytest.mark.parametrize(
    ("ratio", "verdict"),
    [(0.70, "not exceeded"), (1.0, "possibly exceeded"), (1.3, "exceeded")],
)
def test_the_verdict_of_a_day_follows_both_ends(ratio, verdict):
    assert sae_limits([ratio], [480.0], sae=0.25, limit=1.0).verdict == verdict


def test_a_day_without_samples_is_refused():
    with pytest.raises(ValueError, match=r"^concentrations: none given"):
        sae_limits([], [], sae=0.2, limit=1.0)


def test_agents_each_under_their_limit_can_be_over_it_together():
    assert mixture_index([0.6, 0.6], [1.0, 1.0]).index > 1.0


def test_no_exposure_has_no_error():
    assert mixture_index([0.0, 0.0], [1.0, 1.0], sae=0.2).control == 1.0


def test_silica_without_quartz_has_half_the_limit_of_quartz():
    quartz, cristobalite = silica_limit_mg_m3(8.0), silica_limit_mg_m3(0.0, cristobalite_percent=8)
    np.testing.assert_allclose(cristobalite, 0.5 * quartz)
    assert silica_limit_mg_m3(0.0) == 5.0


@pytest.mark.parametrize("n", [1, 2, 5, 20, 200])
def test_never_more_workers_are_drawn_than_there_are(n):
    assert 1 <= workers_to_sample(n, top_share=0.1, conf=0.95) <= n


def test_drawing_catches_one_of_the_highest_as_often_as_asked():
    n, top, conf = 25, 5, 0.95
    drawn = workers_to_sample(n, top_share=0.2, conf=conf)
    miss = np.prod([(n - top - i) / (n - i) for i in range(drawn)])
    fewer = np.prod([(n - top - i) / (n - i) for i in range(drawn - 1)])
    assert miss <= 1.0 - conf < fewer

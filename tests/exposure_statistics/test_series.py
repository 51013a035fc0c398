import numpy as np
import pytest

from exposure.statistics.series import equivalent_readings, lag1_correlation, shift_summary


def test_uneven_steps_weigh_by_their_duration():
    found = shift_summary([0.0, 10.0, 30.0, 40.0], [1.0, 4.0, 1.0, 1.0])
    np.testing.assert_allclose(found.twa, (10 + 80 + 10 + 10) / 50)


def test_the_highest_quarter_hour_is_found_between_readings():
    # 10-minute readings: the best 15 minutes hold the peak and half of its better neighbour.
    found = shift_summary([0.0, 10.0, 20.0, 30.0], [0.0, 6.0, 3.0, 0.0])
    np.testing.assert_allclose(found.highest_15_min, (60 + 15) / 15)
    assert found.highest_15_min_from == 10.0


def test_a_shorter_log_has_no_quarter_hour():
    assert np.isnan(shift_summary([0.0, 1.0, 2.0], [1.0, 2.0, 1.0]).highest_15_min)


def test_the_quarter_hour_lies_between_average_and_peak():
    x = np.exp(np.random.default_rng(4).normal(size=300))
    found = shift_summary(np.arange(300.0), x)
    assert found.twa <= found.highest_15_min <= found.peak == x.max()


def test_negative_noise_stays_in_the_average():
    assert shift_summary(np.arange(4.0), [-1.0, 1.0, -1.0, 1.0]).twa == 0.0


def test_a_gap_is_seen():
    assert shift_summary([0.0, 1.0, 2.0, 8.0, 9.0], np.ones(5)).has_gap
    assert not shift_summary(np.arange(5.0), np.ones(5)).has_gap


def test_a_constant_series_has_no_correlation():
    assert np.isnan(lag1_correlation(np.ones(10)))
    assert np.isnan(shift_summary(np.arange(10.0), np.ones(10)).n_equivalent)


def test_independent_readings_count_in_full():
    assert equivalent_readings(480, 0.0) == 480.0


@pytest.mark.parametrize(
    ("minute", "reading", "message"),
    [
        ([0.0, 1.0], [1.0, 1.0], r"^reading: shape \(2,\) is not allowed"),
        ([0.0, 1.0, 1.0], [1.0] * 3, r"^minute: repeated or falling times"),
        ([0.0, 1.0, 2.0], [1.0, np.nan, 1.0], r"^reading: nan is not allowed"),
    ],
    ids=["too few", "not rising", "not a number"],
)
def test_a_series_that_is_none_is_refused(minute, reading, message):
    with pytest.raises(ValueError, match=message):
        shift_summary(minute, reading)

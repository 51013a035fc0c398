import pytest

from filtration import Limit, shifts, shortest


def test_the_shortest_limit_binds_and_the_rest_follow_in_order():
    limits = [Limit("dust", 13.3, "a"), Limit("policy", 8.0, "b"), Limit("maker", 40.0, "c")]
    schedule = shortest(limits)
    assert schedule.hours == 8.0
    assert schedule.binding.reason == "policy"
    assert [limit.reason for limit in schedule.others] == ["dust", "maker"]


def test_equal_limits_keep_their_order():
    schedule = shortest([Limit("first", 8.0, ""), Limit("second", 8.0, "")])
    assert schedule.binding.reason == "first"


def test_nothing_known_is_not_a_schedule():
    with pytest.raises(ValueError, match=r"^candidates: none given"):
        shortest([])


@pytest.mark.parametrize("hours", [float("nan"), -1.0, float("inf"), None], ids=str)
def test_hours_that_are_no_limit_are_refused(hours):
    with pytest.raises(ValueError, match=r"^hours: .* it must be 0 or more$"):
        Limit("dust", hours, "")


def test_a_limit_without_a_reason_is_refused():
    with pytest.raises(ValueError, match=r"^reason: blank"):
        Limit(" ", 8.0, "")


@pytest.mark.parametrize(
    ("hours", "whole"), [(0.0, 0), (7.99, 0), (8.0, 1), (15.999, 1), (16.0, 2)]
)
def test_shifts_are_rounded_down(hours, whole):
    assert shifts(hours, hours_per_shift=8.0) == whole


def test_a_life_just_short_of_a_shift_is_never_a_shift():
    assert shifts(8.0 - 1e-12, hours_per_shift=8.0) == 0

import numpy as np
import pytest

from exposure.statistics.pack import buckets, pack, without_highest
from tests.exposure_statistics.groups import batch_of


def test_results_land_in_their_groups_in_order():
    batch = pack([3.0, 1.0, 2.0], [0, 0, 1], [1, 0, 1], n_groups=3)
    assert batch.n.tolist() == [1, 2, 0]
    assert batch.values[1].tolist() == [3.0, 2.0]
    assert batch.n_censored.tolist() == [0, 1, 0]


def test_no_results_at_all_make_empty_groups():
    batch = pack([], [], [], n_groups=2)
    assert batch.n.tolist() == [0, 0]
    assert np.isnan(batch.highest).all()


def test_a_nondetect_counts_at_the_larger_of_value_and_limit():
    batch = pack([0.1, -0.3], [1, 1], [0, 0], n_groups=1, lod=[0.2, 0.2])
    assert batch.bound.tolist() == [[0.2, 0.2]]


def test_a_nondetect_without_its_limit_spoils_its_group_only():
    batch = pack([0.1, 0.1], [1, 0], [0, 1], n_groups=2, lod=[np.nan, np.nan])
    assert batch.is_sound.tolist() == [False, True]


@pytest.mark.parametrize("bad", [0.0, -0.01, np.nan, np.inf], ids=str)
def test_a_bad_result_is_kept_and_spoils_its_group(bad):
    batch = batch_of([0.1, bad], [0.1])
    assert batch.n.tolist() == [2, 1]
    assert batch.is_sound.tolist() == [False, True]


def test_the_highest_result_is_a_detect_even_under_a_higher_limit():
    assert batch_of([0.1, "<0.5", 0.2]).highest.tolist() == [0.2]


def test_a_group_number_out_of_range_is_refused():
    with pytest.raises(ValueError, match=r"^group: 2 is not allowed; it must be 0 to 1$"):
        pack([1.0], [0], [2], n_groups=2)


def test_arrays_of_different_length_are_refused():
    with pytest.raises(ValueError, match=r"^values: shapes .* differ"):
        pack([1.0, 2.0], [0], [0, 0], n_groups=1)


def test_buckets_hold_every_group_with_results_once():
    batch = batch_of([1.0] * 3, [], [1.0] * 30, [1.0] * 4)
    parts = {tuple(rows): part.mask.shape[1] for rows, part in buckets(batch)}
    assert parts == {(0, 3): 4, (2,): 30}


def test_leaving_out_the_highest_takes_one_detect_a_group():
    left = without_highest(batch_of([1.0, 9.0, "<20"], ["<1"], []))
    assert left.n.tolist() == [2, 1, 0]
    assert left.highest.tolist()[0] == 1.0


def test_a_nondetect_above_every_detect_tells_nothing():
    batch = batch_of([0.1, "<0.05", "<0.1", "<0.2"], ["<1", "<2"], [])
    assert batch.n_telling.tolist() == [3, 2, 0]
